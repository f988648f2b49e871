"""An edit: spans of a text replaced, what it says of itself, what it moves; applying it and taking it back."""

from collections.abc import Iterable
from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from composer.score.model import Span

Change = tuple[int, int, str]
"""Characters `start` to before `end` of the whole text, from 0, and what stands there instead."""


@dataclass(frozen=True, slots=True, eq=False)
class Moves:
    """Where an edit takes the lines that it moves, an instance each, (n,) arrays: for lighting them while dragging.

    fiber: index in the rig; entry, line: lines of the score, of the section's entry and of the phrase's line (0: another file)
    from_s, to_s: when the move into that line begins and ends once the edit is made; was_from_s, was_to_s: before it
    places_s: (m,) the starts, as edited, of the instances of phrases that it moves: "the twenty places"
    """

    fiber: NDArray[np.int64]
    entry: NDArray[np.int32]
    line: NDArray[np.int32]
    from_s: NDArray[np.float64]
    to_s: NDArray[np.float64]
    was_from_s: NDArray[np.float64]
    was_to_s: NDArray[np.float64]
    places_s: NDArray[np.float64]


def no_moves() -> Moves:
    """Nothing moved."""
    none = np.empty(0)
    return Moves(none.astype(np.int64), none.astype(np.int32), none.astype(np.int32), none, none, none, none, none)


@dataclass(frozen=True, slots=True)
class Edit:
    """Changes of one text, in rising order and none over another; `say` names the edit for the history and the status line."""

    changes: tuple[Change, ...]
    say: str
    moves: Moves = field(default_factory=no_moves, compare=False)


@dataclass(frozen=True, slots=True)
class Refusal:
    """Why there is no edit, as a sentence."""

    say: str


def edit_of(changes: Iterable[Change], say: str, moves: Moves | None = None) -> Edit:
    """An edit of changes in any order; those that change nothing are left out. Raises ValueError where two overlap."""
    kept = tuple(sorted(change for change in changes if change[0] != change[1] or change[2]))
    for (_, end, _), (start, _, _) in pairwise(kept):
        if start < end:
            raise ValueError("changes overlap")
    return Edit(kept, say, moves or no_moves())


def apply(text: str, edit: Edit) -> str:
    """The text with an edit made."""
    parts, at = [], 0
    for start, end, new in edit.changes:
        parts += [text[at:start], new]
        at = end
    return "".join([*parts, text[at:]])


def inverse(text: str, edit: Edit) -> Edit:
    """The edit that takes `edit`, made on `text`, back."""
    changes, shift = [], 0
    for start, end, new in edit.changes:
        changes.append((start + shift, start + shift + len(new), text[start:end]))
        shift += len(new) - (end - start)
    return Edit(tuple(changes), edit.say)


def lines_after(edited: str, changes: Iterable[Change], most: int) -> list[int]:
    """The lines of an edited text that the first `most` of the changes have written, from 1."""
    lines, shift = [], 0
    for start, end, new in list(changes)[:most]:
        # A line that is put in whole begins behind one line feed and ends with another: it is one line.
        put = new.strip("\n")
        first = edited.count("\n", 0, start + shift) + 1 + new[: len(new) - len(new.lstrip("\n"))].count("\n")
        lines += range(first, first + put.count("\n") + 1)
        shift += len(new) - (end - start)
    return list(dict.fromkeys(lines))


def line_starts(text: str) -> list[int]:
    """Where each line of a text begins, lines as a score counts them (ended by a line feed)."""
    starts, at = [0], text.find("\n")
    while at >= 0:
        starts.append(at + 1)
        at = text.find("\n", at + 1)
    return starts


def change_at(text: str, span: Span, new: str, starts: list[int] | None = None) -> Change:
    """A span of the model as a change of the whole text; `starts` as `line_starts` gives them, where there are many."""
    start = (starts or line_starts(text))[span.line - 1]
    return start + span.column - 1, start + span.end - 1, new
