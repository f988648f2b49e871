"""One history for typing, drags and mends: what was done, undone and can be done again, in bounded memory."""

from dataclasses import dataclass, replace

from composer.edits.edit import Edit, Refusal, apply, inverse
from composer.score.bounds import BOUNDS, most

MOST_BYTES = 64 * 1024 * 1024
"""Memory that the steps of a history may take; the oldest go first."""

LONGEST_NAME = 24
"""Characters of what was typed that a step is named by."""

OVERHEAD = 200
"""Bytes that a step takes beside its texts, about."""


@dataclass(frozen=True, slots=True)
class Step:
    """One step: the edit and its inverse, whether typing may still join it, and the bytes that it takes."""

    edit: Edit
    back: Edit
    typing: bool
    size: int


@dataclass(frozen=True, slots=True)
class Link:
    """A step upon those before it; `size`: bytes of all of them, `count`: how many."""

    step: Step
    below: "Link | None"
    size: int
    count: int


@dataclass(frozen=True, slots=True)
class History:
    """A text and how it came to be; never changed, each step gives a new one that shares the old."""

    text: str
    done: Link | None = None
    undone: Link | None = None


def do(history: History, edit: Edit, typing: bool = False) -> History | Refusal:
    """An edit made; what had been undone can no longer be done again. `typing` joins the step before it into a word.

    Refused, with a sentence, where the text would be larger than a score may be.
    """
    if not edit.changes:
        return history
    grown = len(history.text) + sum(len(new) - (end - start) for start, end, new in edit.changes)
    added = sum(len(new) for _, _, new in edit.changes)
    bound = most("file")
    if grown > bound or (grown > bound // 4 and _bytes(history, edit) > bound):
        return Refusal(
            f"That would make the text {grown / 1e6:.1f} million characters long, {added / 1e6:.1f} million of them new; "
            f"a score has at most {bound} {BOUNDS['file'].says}. Nothing was changed."
        )
    lines = history.text.count("\n") + sum(
        new.count("\n") - history.text.count("\n", start, end) for start, end, new in edit.changes
    )
    if lines > most("lines"):
        return Refusal(
            f"That would make the text {lines} lines long; a score has at most {most('lines')} lines. Nothing was changed."
        )
    # What lit a drag is of no use later, and may be large.
    step = _step(Edit(edit.changes, edit.say), inverse(history.text, edit), typing)
    below = history.done
    if typing and below is not None and below.step.typing and (joined := _joined(below.step, step)) is not None:
        step, below = joined, below.below
    return History(apply(history.text, edit), _bounded(_upon(step, below)), None)


def typed(history: History, start: int, end: int, new: str) -> History | Refusal:
    """A keystroke or a paste: characters `start` to before `end` replaced by others."""
    old = history.text[start:end]
    if new == old:
        return history
    edit = Edit(((start, end, new),), _name(old, new))
    return do(history, edit, typing=len(new) <= 1 and len(old) <= 1)


def closed(history: History) -> History:
    """The same, but what is typed next begins a step of its own (the caret was moved, the text saved)."""
    if history.done is None or not history.done.step.typing:
        return history
    return replace(history, done=replace(history.done, step=replace(history.done.step, typing=False)))


def undo(history: History) -> tuple[History, Edit | None]:
    """One step back, and the edit that goes there, for the view; None where there is nothing to undo."""
    if history.done is None:
        return history, None
    step = history.done.step
    text = apply(history.text, step.back)
    undone = _upon(replace(step, typing=False), history.undone)
    return History(text, history.done.below, undone), step.back


def redo(history: History) -> tuple[History, Edit | None]:
    """One step forward again."""
    if history.undone is None:
        return history, None
    step = history.undone.step
    return History(apply(history.text, step.edit), _upon(step, history.done), history.undone.below), step.edit


def names(history: History, most: int = 50) -> tuple[str, ...]:
    """What the last steps were, the latest first."""
    found, at = [], history.done
    while at is not None and len(found) < most:
        found.append(at.step.edit.say)
        at = at.below
    return tuple(found)


def _bytes(history: History, edit: Edit) -> int:
    return len(apply(history.text, edit).encode("utf-8", "replace"))


def _step(edit: Edit, back: Edit, typing: bool) -> Step:
    # A character takes up to four bytes; most texts take one.
    size = OVERHEAD + sum(len(new) for one in (edit, back) for _, _, new in one.changes)
    return Step(edit, back, typing, size)


def _upon(step: Step, below: Link | None) -> Link:
    return Link(step, below, step.size + (below.size if below else 0), 1 + (below.count if below else 0))


def _bounded(top: Link) -> Link:
    """The steps, without the oldest where they take too much; halved then, so that it is seldom done."""
    if top.size <= MOST_BYTES:
        return top
    kept, size, at = [], 0, top
    while at is not None and (not kept or size + at.step.size <= MOST_BYTES // 2):
        kept.append(at.step)
        size += at.step.size
        at = at.below
    link = None
    for step in reversed(kept):
        link = _upon(step, link)
    return link


def _joined(first: Step, second: Step) -> Step | None:
    """Two steps of typing as one, where the second goes on with the first and begins no new word."""
    (start, end, new), (start2, end2, new2) = first.edit.changes[0], second.edit.changes[0]
    old, old2 = first.back.changes[0][2], second.back.changes[0][2]
    if new2 and not old2 and not old and start2 == start + len(new):
        if (not new2.isspace() and new[-1:].isspace()) or "\n" in new + new2:
            return None  # a word ends with the space behind it
        change, undoing = (start, end, new + new2), (start, start + len(new) + len(new2), "")
        removed = ""
    elif not new2 and old2 and not new and end2 == start:  # backspaces
        change, removed = (start2, end, ""), old2 + old
        undoing = (start2, start2, removed)
    elif not new2 and old2 and not new and start2 == start:  # deletions
        change, removed = (start, end + len(old2), ""), old + old2
        undoing = (start, start, removed)
    else:
        return None
    if "\n" in removed:
        return None
    name = _name(removed, change[2])
    return _step(Edit((change,), name), Edit((undoing,), name), True)


def _name(old: str, new: str) -> str:
    """What was typed or removed, as a step is named."""
    shown = (new or old).strip() or ("a new line" if "\n" in new + old else "a space")
    shown = shown.split("\n")[0]
    shown = shown if len(shown) <= LONGEST_NAME else shown[: LONGEST_NAME - 1] + "…"
    verb = "typed" if new and len(new) <= 200 and not old else "pasted" if len(new) > 200 else "replaced" if new else "removed"
    return f"{verb} {shown}"
