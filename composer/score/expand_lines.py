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

UNIT_NUMBERS = {unit: number for number, unit in enumerate(TARGET_UNITS)}
SHAPE_NUMBERS = {name: number for number, name in enumerate(NAMES)}


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


_ZERO = Fraction(0)
_NOTHING = (_ZERO, _ZERO, _ZERO)


def parts(duration: Duration | None) -> tuple[Fraction, ...]:
    """A duration as parts of TIME_UNITS; none at all for None."""
    if duration is None:
        return _NOTHING
    value, unit = duration.value, duration.unit
    return (value if unit == "bars" else _ZERO, value if unit == "counts" else _ZERO, value if unit == "s" else _ZERO)


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
        return np.array([_number(part) for value in values for part in value], dtype=float).reshape(-1, 3)

    control, control_unit = np.zeros((len(rows), 4)), np.full((len(rows), 4), HELD, dtype=np.int8)
    over, lasts = np.zeros((len(rows), 3)), np.zeros((len(rows), 3))
    hertz, by, by_unit = np.zeros(len(rows)), np.zeros(len(rows)), np.full(len(rows), HELD, dtype=np.int8)
    has_over, has_lasts = np.zeros(len(rows), dtype=bool), np.zeros(len(rows), dtype=bool)
    for at, row in enumerate(rows):  # what few lines have
        if row.over is not None:
            over[at], has_over[at] = [_number(part) for part in parts(row.over)], row.shape != "step"
        if row.lasts is not None:
            lasts[at], has_lasts[at] = [_number(part) for part in row.lasts], True
        if row.controls:
            control[at] = [_number(inner.value) for inner in row.controls]
            control_unit[at] = [UNIT_NUMBERS[inner.unit] for inner in row.controls]
        if (quiver := row.quiver) is not None:
            hertz[at], by[at], by_unit[at] = _number(quiver.hertz), _number(quiver.by.value), UNIT_NUMBERS[quiver.by.unit]
    numbers: list[float] = []
    for row in rows:  # one flat list of plain numbers, the form that becomes an array soonest
        bars, counts, seconds = row.offset
        line = row.source.span.line if row.source.span.file == file else 0
        numbers += (_number(bars), _number(counts), _number(seconds), _number(row.target.value))
        numbers += (UNIT_NUMBERS[row.target.unit], SHAPE_NUMBERS[row.shape], row.shut, line)
    table = np.array(numbers, dtype=float).reshape(-1, 8)
    whole = table[:, 4:].astype(np.int32)
    return Lines(
        first=np.array(first, dtype=np.int64),
        length=triples(lengths),
        offset=table[:, :3].copy(),
        over=over,
        has_over=has_over,
        lasts=lasts,
        has_lasts=has_lasts,
        value=table[:, 3].copy(),
        unit=whole[:, 0].astype(np.int8),
        control=control,
        control_unit=control_unit,
        shape=whole[:, 1].astype(np.int8),
        shut=whole[:, 2] != 0,
        phrase_line=whole[:, 3].copy(),
        written=tuple(row.source for row in rows),
        phrases=tuple(phrases),
        hertz=hertz,
        by=by,
        by_unit=by_unit,
    )


def _number(value: Fraction) -> float:
    """The float nearest to a fraction, without the ways round of `float`."""
    return 0.0 if value is _ZERO else value.numerator / value.denominator
