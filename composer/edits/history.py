"""One history for typing, drags and mends: what was done, undone and can be done again, in bounded memory."""

from dataclasses import dataclass

from composer.edits.edit import Edit, Refusal

MOST_BYTES = 64 * 1024 * 1024
"""Memory that a history may take; the oldest steps go first."""


@dataclass(frozen=True, slots=True)
class Step:
    """One step: the edit and its inverse, and whether typing may still join it."""

    edit: Edit
    back: Edit
    typing: bool
    size: int


@dataclass(frozen=True, slots=True)
class History:
    """A text and how it came to be; never changed, each step gives a new one that shares the old."""

    text: str
    done: "Link | None" = None
    undone: "Link | None" = None


@dataclass(frozen=True, slots=True)
class Link:
    """A step upon those before it; `size`: bytes of all of them, `count`: how many."""

    step: Step
    below: "Link | None"
    size: int
    count: int


def do(history: History, edit: Edit, typing: bool = False) -> History | Refusal:
    """An edit made; what had been undone can no longer be done again. `typing` joins the step before it into a word."""
    raise NotImplementedError


def typed(history: History, start: int, end: int, new: str) -> History | Refusal:
    """A keystroke or a paste: characters `start` to before `end` replaced."""
    raise NotImplementedError


def closed(history: History) -> History:
    """The same, but what is typed next begins a step of its own (the caret was moved, the text saved)."""
    raise NotImplementedError


def undo(history: History) -> tuple[History, Edit | None]:
    """One step back, and the edit that was made to go there, for the view; None where there is nothing to undo."""
    raise NotImplementedError


def redo(history: History) -> tuple[History, Edit | None]:
    """One step forward again."""
    raise NotImplementedError


def names(history: History, most: int = 50) -> tuple[str, ...]:
    """What the last steps were, the latest first."""
    raise NotImplementedError
