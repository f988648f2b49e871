"""A flat score: every move of tracks written out as a text that reads back to the same tracks."""

from collections import Counter
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import zip_longest
from math import isclose
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from composer.faults import fault
from composer.quivers import pairs
from composer.rig.model import Rig
from composer.score.bounds import BOUNDS, most
from composer.score.expand_ways import NO_WAY
from composer.score.layers import BEZIER
from composer.score.model import Score, Span
from composer.score.tempo import TempoMap
from composer.shapes import PROGRESS
from composer.tracks import HOLD, SAME_INSTANT_S, STEP, SUDDEN, Tracks

Array = NDArray[np.float64]

DIGITS = 12
"""Digits after the point: a picosecond, and 1e-14 of strain as it is written in per cent."""

WHOLE_SHAPES = 1e-12
"""Strain by which a segment may differ from a named shape and still be written by its name."""

BELOW_REST = 1e-9
"""Strain below rest that is no more than rounding, and is written as rest."""


class CuePlace(Protocol):
    """A cue at its instant, in seconds; `composer.load.CuePoint` is one."""

    @property
    def name(self) -> str:
        """As the score has it."""

    @property
    def seconds(self) -> float:
        """From the score's start."""

    @property
    def wait(self) -> bool:
        """Whether the player waits there."""


@dataclass(slots=True)
class _Part:
    """The phrase of one fiber, its `number`th, from `start_s` on, as lines of text; `reaches_s` its last line's instant;
    `adds`: a quiver that is to be added to what is there.
    """

    fiber: int
    number: int
    start_s: float
    reaches_s: float
    lines: list[str]
    adds: bool = False


def write_flat(
    tracks: Tracks, score: Score, rig: Rig, tempo: TempoMap, cues: Iterable[CuePlace] = (), rig_path: str | None = None
) -> str:
    """The text of a score that expands to `tracks` within a microsecond and 1e-9 of strain.

    Meter, tempo, pins and what retiming protects stand as in `score`; `cues` where they are now (they move with what is
    retimed). rig_path: the rig's path relative to where the text will be, that of `score` where it is not given.
    Raises Faults where the text would be larger than a score may be, or a fiber goes below rest.
    """
    inline = _inline(tracks)
    parts = [part for fiber in range(tracks.fibers) for part in _parts(tracks, fiber, rig, inline)]
    parts = _lasting(parts, tracks.duration_s)
    parts += _added(tracks, rig, inline)
    lines = [*_head(score, rig_path), *_cues(score, tempo, cues)]
    count = len(lines) + sum(len(part.lines) + 2 for part in parts)
    if count > most("lines"):
        raise _too_large(score, f"{count} lines", f"{most('lines')} {BOUNDS['lines'].says}")
    for part in parts:
        lines += ["", f"phrase {_phrase_name(part, rig)}{_length(part, tracks.duration_s, part is parts[0])}", *part.lines]
    if parts:
        lines += ["", "section flat at 0s"]
        widest = max(len(rig.fibers[part.fiber].name) for part in parts)
        for part in sorted(parts, key=lambda part: (part.start_s, part.fiber)):
            entry = f"  {rig.fibers[part.fiber].name:<{widest}}  {_phrase_name(part, rig)}  at {_number(part.start_s)}s"
            lines.append(entry + ("  add" if part.adds else ""))
    text = "\n".join(lines) + "\n"
    size = len(text.encode())
    if size > most("file"):
        raise _too_large(score, f"{size} bytes", f"{most('file')} {BOUNDS['file'].says}")
    return text


def _too_large(score: Score, has: str, bound: str) -> Exception:
    return fault(
        score.file,
        f"written out flat this score would have {has}",
        f"at most {bound}",
        "write a play file instead, or cut the score in parts",
    )


def _head(score: Score, rig_path: str | None) -> Iterator[str]:
    """What stands before the phrases, the score's own words where nothing has changed."""
    told = f' of "{score.title}"' if score.title else ""
    yield f"# Every move{told} written out: one phrase a fiber, offsets in seconds, targets in strain."
    yield ""
    if score.title:
        yield f'title   "{score.title}"'
    rig = rig_path or (score.rig.text if score.rig else "")
    if rig:
        plain = not any(character.isspace() or character in '"#' for character in rig)
        yield f"rig     {rig}" if plain else f'rig     "{rig}"'
    for statement in (*score.meters, *score.tempi):
        yield _as_written(score, statement.span)
    if score.keep != "clock":
        yield f"keep    {score.keep}"
    for pin in score.pins:
        yield _as_written(score, pin.span)


def _as_written(score: Score, span: Span) -> str:
    return score.lines[span.file][span.line - 1][span.column - 1 : span.end - 1]


def _cues(score: Score, tempo: TempoMap, cues: Iterable[CuePlace]) -> Iterator[str]:
    """Cues that have not moved in the score's own words, the others in seconds."""
    written = {(cue.name, cue.wait): cue for cue in score.cues}
    for cue in cues:
        was = written.get((cue.name, cue.wait))
        if was and isclose(float(tempo.seconds(tempo.counts_of(was.at))), cue.seconds, abs_tol=SAME_INSTANT_S):
            yield _as_written(score, was.span)
        else:
            yield f'cue     "{cue.name}" at {_number(cue.seconds)}s' + (" wait" if cue.wait else "")


def _inline(tracks: Tracks) -> dict[int, int]:
    """The quivers that a line can say: those that lie over one segment and are alone there, by segment."""
    segment, _ = pairs(tracks.quivers)
    alone = dict.fromkeys(np.flatnonzero(np.bincount(segment) == 1).tolist())
    quivers = tracks.quivers
    return {int(k): n for n, k in enumerate(quivers.knot.tolist()) if quivers.until[n] == k + 1 and k in alone}


def _added(tracks: Tracks, rig: Rig, inline: dict[int, int]) -> Iterator[_Part]:
    """The other quivers: a phrase each that does nothing but quiver, to be added to what its fiber does."""
    told, numbers = set(inline.values()), Counter[int]()
    quivers = tracks.quivers
    fiber = np.searchsorted(tracks.first, quivers.knot, side="right") - 1
    for n, f in enumerate(fiber.tolist()):
        begins, ends = float(tracks.time_s[quivers.knot[n]]), float(tracks.time_s[quivers.until[n]])
        if n in told or ends <= begins + SAME_INSTANT_S or quivers.amplitude[n] <= 0.0:
            continue
        numbers[f] += 1
        yield _Part(f, numbers[f], begins, ends, [f"  {_number(ends - begins)}s  hold{_quiver(tracks, n, rig, f)}"], True)


def _quiver(tracks: Tracks, number: int, rig: Rig, fiber: int) -> str:
    quivers = tracks.quivers
    if quivers.amplitude[number] <= 0.0:
        return ""
    return f" quiver {_number(float(quivers.hertz[number]))}Hz by {_percent(float(quivers.amplitude[number]), rig, fiber)}"


def _parts(tracks: Tracks, fiber: int, rig: Rig, inline: dict[int, int]) -> Iterator[_Part]:
    """The phrases of one fiber: one, and a further one from each jump straight out of a move: only a phrase can begin so."""
    part: _Part | None = None
    number = 0
    segments = _segments(tracks, int(tracks.first[fiber]), int(tracks.first[fiber + 1]) - 1)
    for (k, jumps), following in zip_longest(segments, segments[1:]):
        ends = float(tracks.time_s[k + 1])
        if tracks.manner[k] == HOLD and following is not None and following[1]:
            continue  # the line of the jump says that the fiber holds until then
        if part is None or (jumps and ends <= part.reaches_s + SAME_INSTANT_S):
            if part is not None:
                yield part
            number += 1
            begins = ends if jumps else float(tracks.time_s[k])
            part = _Part(fiber, number, begins, begins, [])
            if jumps:
                part.lines.append(f"  0  {_percent(float(tracks.curve[k].sum()), rig, fiber)}")
                continue
        quiver = _quiver(tracks, inline[k], rig, fiber) if k in inline else ""
        part.lines.append(f"  {_number(ends - part.start_s)}s  {_move(tracks, k, jumps, rig, fiber)}{quiver}")
        part.reaches_s = ends
    if part is not None:
        yield part


def _segments(tracks: Tracks, low: int, last: int) -> list[tuple[int, bool]]:
    """The segments that are to be written and whether each is a jump; jumps at one instant are one, the last."""
    told: list[tuple[int, bool]] = []
    for k in range(low, last):
        jumps = tracks.manner[k] == STEP or tracks.time_s[k + 1] - tracks.time_s[k] <= SAME_INSTANT_S
        if jumps and (tracks.manner[k] == HOLD or abs(float(tracks.curve[k, 1:].sum())) <= NO_WAY):
            continue
        if jumps and told and told[-1][1] and tracks.time_s[k] - tracks.time_s[told[-1][0]] <= SAME_INSTANT_S:
            told.pop()
        told.append((k, bool(jumps)))
    return told


def _move(tracks: Tracks, k: int, jumps: bool, rig: Rig, fiber: int) -> str:
    """Target and way of a segment."""
    if jumps:
        return f"{_percent(float(tracks.curve[k].sum()), rig, fiber)} step"
    if not tracks.curve[k, 1:].any():
        return "hold"
    curve = tracks.curve[k]
    target = _percent(float(curve.sum()), rig, fiber)
    if tracks.manner[k] == SUDDEN:
        return f"{target} sudden"
    for shape in ("smooth", "linear", "swell", "settle"):
        whole = PROGRESS[shape] * (curve.sum() - curve[0])
        whole[0] += curve[0]
        if np.abs(whole - curve).max() <= WHOLE_SHAPES:
            return f"{target} {shape}"
    inner = " ".join(_percent(float(value), rig, fiber) for value in controls(curve)[1:5])
    return f"{target} curve {inner}"


def controls(curve: Array) -> Array:
    """The six control values of the Bézier curve of degree 5 that a polynomial, (6,) lowest power first, is."""
    return curve @ POINTS


POINTS = np.linalg.inv(BEZIER)


def _lasting(parts: Sequence[_Part], duration_s: float) -> list[_Part]:
    """The parts, the one that is to carry the score's length first; a still score is a hold of its length."""
    if not parts and duration_s > SAME_INSTANT_S:
        return [_Part(0, 1, 0.0, duration_s, [f"  {_number(duration_s)}s hold"])]
    last = max(parts, key=lambda part: part.start_s, default=None)
    return [] if last is None else [last, *(part for part in parts if part is not last)]


def _length(part: _Part, duration_s: float, carries: bool) -> str:
    """The declared length of the part that starts last, where the score goes on after its last line."""
    if not carries or duration_s <= part.reaches_s + SAME_INSTANT_S:
        return ""
    return f" {_number(duration_s - part.start_s)}s"


def _phrase_name(part: _Part, rig: Rig) -> str:
    about = "quivers" if part.adds else "moves"
    return f"{about}.{rig.fibers[part.fiber].name}" + (f".part{part.number}" if part.number > 1 else "")


def _percent(strain: float, rig: Rig, fiber: int) -> str:
    if strain < -BELOW_REST:
        raise fault(
            rig.file,
            f"'{rig.fibers[fiber].name}' goes to {strain * 100:.3g} % strain, below rest, which no score can say",
            "tracks that stay at rest or above",
        )
    return f"{_number(max(0.0, strain * 100.0))}%"


def _number(value: float) -> str:
    return f"{value:.{DIGITS}f}".rstrip("0").rstrip(".")


def fiber_in_words(tracks: Tracks, fiber: int, rig: Rig) -> list[tuple[str, float, bool, list[str]]]:
    """All that one fiber does, as phrases: (name, start in s, whether it is added, lines), as `write_flat` has them."""
    inline = _inline(tracks)
    parts = [*_parts(tracks, fiber, rig, inline), *(part for part in _added(tracks, rig, inline) if part.fiber == fiber)]
    return [(_phrase_name(part, rig), part.start_s, part.adds, part.lines) for part in parts]
