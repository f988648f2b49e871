"""Phrases as arrays: the lines of every phrase that a score plays, forwards or backwards, end to end in one table."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from composer.faults import Fault
from composer.score.model import Duration, Line, Phrase, Quiver, Score, Target
from composer.score.tempo import fault_at
from composer.shapes import BACKWARDS, NAMES

Array = NDArray[np.float64]

TIME_UNITS = ("bars", "counts", "s")
"""The parts of an offset, in the order in which they are gone through from a fiber's start."""

TARGET_UNITS = ("stroke", "%", "mm", "deg", "hold")
HELD = TARGET_UNITS.index("hold")


@dataclass(frozen=True, slots=True, eq=False)
class Lines:
    """V variants of phrases; the lines of variant v are `first[v]:first[v + 1]` of n in all.

    offset: (n, 3) of a line from its start, in parts of TIME_UNITS; length: (V, 3) the same of the whole variant
    over: (n, 3) how long before its offset the move into a line begins, where `has_over`
    lasts: (n, 3) how long the move lasts that begins at the line before, where `has_lasts` (in phrases played backwards)
    value, unit: (n,) target in the unit TARGET_UNITS[unit]
    control, control_unit: (n, 4) the inner control values of shape `curve`
    shape: (n,) index into shapes.NAMES; shut: (n,) where no time may pass to the line before (the end of one played backwards)
    phrase_line: (n,) line in the score's own file, 0 in another; written: the line as read, by row
    hertz: (n,) of the quiver on a line, 0 without one; by, by_unit: (n,) its amplitude in the unit TARGET_UNITS[by_unit]
    """

    first: NDArray[np.int64]
    length: Array
    offset: Array
    over: Array
    has_over: NDArray[np.bool_]
    lasts: Array
    has_lasts: NDArray[np.bool_]
    value: Array
    unit: NDArray[np.int8]
    control: Array
    control_unit: NDArray[np.int8]
    shape: NDArray[np.int8]
    shut: NDArray[np.bool_]
    phrase_line: NDArray[np.int32]
    written: tuple[Line, ...]
    phrases: tuple[Phrase, ...]
    hertz: Array
    by: Array
    by_unit: NDArray[np.int8]


@dataclass(frozen=True, slots=True)
class _Row:
    """One line of a variant, before it becomes numbers: `offset` and `lasts` are parts of TIME_UNITS."""

    offset: tuple[Fraction, ...]
    target: Target
    shape: str
    source: Line
    over: Duration | None = None
    lasts: tuple[Fraction, ...] | None = None
    controls: tuple[Target, ...] = ()
    quiver: Quiver | None = None
    shut: bool = False


_NOTHING = (Fraction(0), Fraction(0), Fraction(0))


def parts(duration: Duration | None) -> tuple[Fraction, ...]:
    """A duration as parts of TIME_UNITS; none at all for None."""
    if duration is None:
        return _NOTHING
    return tuple(duration.value if unit == duration.unit else Fraction(0) for unit in TIME_UNITS)


def phrase_length(phrase: Phrase) -> Duration | None:
    """As declared, else the offset of its last line; None for a phrase without either."""
    if phrase.length is not None:
        return phrase.length
    return phrase.lines[-1].offset if phrase.lines else None


def phrase_lines(score: Score, wanted: list[tuple[str, bool]], faults: list[Fault]) -> Lines:
    """The table of the wanted variants: (phrase name, whether backwards). Faults are added to `faults`."""
    rows: list[_Row] = []
    first, lengths, phrases = [0], [], []
    for name, backwards in wanted:
        phrase = score.phrases[name]
        phrases.append(phrase)
        rows.extend(_backwards(phrase, faults) if backwards else _forwards(phrase))
        first.append(len(rows))
        lengths.append(parts(phrase_length(phrase)))
    return _table(rows, first, lengths, phrases, score.file)


def _forwards(phrase: Phrase) -> list[_Row]:
    rows = [
        _Row(parts(line.offset), line.target, line.shape, line, line.over, None, line.controls, line.quiver)
        for line in phrase.lines
    ]
    # A phrase of silence still takes over: its fibers hold.
    return rows or [_silence(phrase)]


def _silence(phrase: Phrase) -> _Row:
    hold, start = Target(Fraction(0), "hold", phrase.span), Duration(Fraction(0), "counts", phrase.span)
    return _Row(_NOTHING, hold, "linear", Line(start, hold, "linear", None, (), None, phrase.span))


def _backwards(phrase: Phrase, faults: list[Fault]) -> list[_Row]:
    """The phrase's curve from its end to its start: each line's target is that of the line before it."""
    lines = phrase.lines
    if not lines or any(parts(lines[0].offset)) or lines[0].target.unit == "hold":
        span = lines[0].span if lines else phrase.span
        faults.append(
            fault_at(
                span,
                f"phrase '{phrase.name}' is played retrograde and has nothing to end on",
                "a line at 0 with a target",
                "give it a first line such as '0 rest'",
            )
        )
        return _forwards(phrase)
    whole = parts(phrase_length(phrase))
    targets: list[Target] = []
    for line in lines:
        targets.append(targets[-1] if line.target.unit == "hold" else line.target)
    rows = [_Row(_NOTHING, targets[-1], "linear", lines[-1])]
    hold = Target(Fraction(0), "hold", lines[-1].span)
    if any(_less(whole, parts(lines[-1].offset))):
        rows.append(_Row(_less(whole, parts(lines[-1].offset)), hold, "linear", lines[-1], shut=True))
    for k in range(len(lines) - 1, 0, -1):
        line, arrives = lines[k], _less(whole, parts(lines[k - 1].offset))
        lasts = None
        if line.shape == "step":
            lasts = _NOTHING
        elif line.over is not None and line.shape != "sudden":
            lasts = parts(line.over)
        controls = tuple(targets[k - 1] if c.unit == "hold" else c for c in reversed(line.controls))
        shape = BACKWARDS.get(line.shape, line.shape)
        rows.append(_Row(arrives, targets[k - 1], shape, line, None, lasts, controls, line.quiver))
    return rows


def _less(a: tuple[Fraction, ...], b: tuple[Fraction, ...]) -> tuple[Fraction, ...]:
    return tuple(x - y for x, y in zip(a, b, strict=True))


def _table(rows: list[_Row], first: list[int], lengths: list[tuple[Fraction, ...]], phrases: list[Phrase], file: str) -> Lines:
    def triples(values: list[tuple[Fraction, ...]]) -> Array:
        return np.array([[float(part) for part in value] for value in values], dtype=float).reshape(-1, 3)

    def column(values: list, kind: type) -> NDArray:
        return np.array(values, dtype=kind)

    quivers = [row.quiver for row in rows]
    controls = [row.controls or (None,) * 4 for row in rows]
    written = tuple(row.source for row in rows)
    return Lines(
        first=column(first, np.int64),
        length=triples(lengths),
        offset=triples([row.offset for row in rows]),
        over=triples([parts(row.over) for row in rows]),
        has_over=column([row.over is not None and row.shape != "step" for row in rows], np.bool_),
        lasts=triples([row.lasts or _NOTHING for row in rows]),
        has_lasts=column([row.lasts is not None for row in rows], np.bool_),
        value=column([float(row.target.value) for row in rows], np.float64),
        unit=column([TARGET_UNITS.index(row.target.unit) for row in rows], np.int8),
        control=column([[0.0 if c is None else float(c.value) for c in four] for four in controls], np.float64).reshape(-1, 4),
        control_unit=column(
            [[HELD if c is None else TARGET_UNITS.index(c.unit) for c in four] for four in controls], np.int8
        ).reshape(-1, 4),
        shape=column([NAMES.index(row.shape) for row in rows], np.int8),
        shut=column([row.shut for row in rows], np.bool_),
        phrase_line=column([row.source.span.line if row.source.span.file == file else 0 for row in rows], np.int32),
        written=written,
        phrases=tuple(phrases),
        hertz=column([0.0 if q is None else float(q.hertz) for q in quivers], np.float64),
        by=column([0.0 if q is None else float(q.by.value) for q in quivers], np.float64),
        by_unit=column([HELD if q is None else TARGET_UNITS.index(q.by.unit) for q in quivers], np.int8),
    )
