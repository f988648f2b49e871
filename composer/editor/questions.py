"""What the window asks of a worker about a text, in one table."""

import os
from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING, Any

import numpy as np

from composer.editor import disk
from composer.editor.messages import Dragged, Ghost, Mended, Taking
from composer.edits import completion, dragging, hover, threads
from composer.edits.edit import Edit, Refusal, apply
from composer.faults import Faults
from composer.limits.snag import Snag
from composer.score.model import Place, Span

if TYPE_CHECKING:
    from composer.editor.desk import Desk


@dataclass(frozen=True, slots=True)
class Question:
    """How a question is answered; whether it needs the text to have been read, and checked, as it now is.

    lasting: it is answered although the text has changed since it was asked: of the text as it is then or, where that cannot be
        read, of the last that could
    """

    answer: Callable[..., Any]
    needs_made: bool = True
    needs_check: bool = False
    lasting: bool = False


def _complete(desk: "Desk", line: int, column: int) -> tuple[completion.Offer, ...]:
    folder = os.path.dirname(os.path.abspath(desk.file))
    return completion.complete(
        desk.text, line, column, desk.made, paths=lambda typed, ending: disk.paths_in(folder, typed, ending)
    )


def _explain(desk: "Desk", line: int, column: int) -> hover.Hover | None:
    return hover.explain(desk.text, line, column, desk.made)


def _source(desk: "Desk", fiber: int, seconds: float) -> threads.Source | None:
    return threads.source_at(desk.threads(), fiber, seconds)


def _moved(desk: "Desk", line: int) -> threads.Stretches:
    return threads.moved_by(desk.threads(), line)


def _drag(
    desk: "Desk", segment: int, time_s: float | None, strain: float | None, grid: Fraction, free: bool
) -> Dragged | Refusal:
    """The knot in which a segment ends, dragged."""
    tracks = desk.made.tracks
    if not 0 <= segment < len(tracks.time_s) - 1:
        return Refusal("That knot is gone.")
    fiber = int(np.searchsorted(tracks.first, segment, side="right")) - 1
    held = dragging.grip(desk.made, fiber, segment + 1)
    return _dragged(desk, dragging.drag(desk.made_text, desk.made, held, time_s, strain, grid, free))


def _dragged(desk: "Desk", edit: Edit | Refusal) -> Dragged | Refusal:
    if isinstance(edit, Refusal):
        return edit
    try:
        after = Ghost(desk.remake(apply(desk.made_text, edit)).tracks)
    except Faults as wrong:
        return Refusal(f"Not there: {wrong.faults[0].found}.")
    return Dragged(edit, after)


def _copy(desk: "Desk", entry: int) -> Edit | Refusal:
    return dragging.copy_for_this_one(desk.made_text, desk.made, entry)


def _seconds(desk: "Desk", bar: int, count: float) -> float:
    """The instant of a place, in s."""
    span = Span(desk.file, 1, 1, 1)
    tempo = desk.made.tempo
    return float(tempo.seconds(tempo.counts_of(Place(bar, Fraction(count), None, span))))


def _mends(desk: "Desk", snag: Snag) -> Mended | Refusal:
    return desk.solver.mended(snag)


def _take(desk: "Desk", from_s: float, to_s: float) -> Taking | Refusal:
    return desk.solver.taken(from_s, to_s)


def _print(desk: "Desk", lines: tuple[tuple[str, str, str], ...], paper: str) -> bytes | Refusal | None:
    """The pages of what can be read, as a PDF file."""
    return desk.solver.printed(lines, paper)


QUESTIONS: dict[str, Question] = {
    "complete": Question(_complete, needs_made=False),
    "explain": Question(_explain, needs_made=False),
    "source": Question(_source),
    "moved": Question(_moved),
    "drag": Question(_drag),
    "copy": Question(_copy),
    "seconds": Question(_seconds),
    "mends": Question(_mends),
    "take": Question(_take),
    "print": Question(_print, lasting=True),
}
