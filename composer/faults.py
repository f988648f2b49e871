"""Faults of what a person wrote, as data, and the one place where they become sentences."""

from collections.abc import Iterable
from dataclasses import dataclass
from difflib import get_close_matches


@dataclass(frozen=True, slots=True)
class Where:
    """A span of one line of a file: line and column count from 1, `width` in characters, `text` the whole line.

    Line 0 means the file as a whole, column 0 the line as a whole.
    """

    file: str
    line: int = 0
    column: int = 0
    width: int = 1
    text: str = ""


@dataclass(frozen=True, slots=True)
class Fault:
    """One fault: where it stands, what was found there, what was expected, and what to do about it."""

    where: Where
    found: str
    expected: str = ""
    hint: str = ""


class Faults(Exception):
    """All the faults of one input; a command prints them and ends with exit code 2."""

    def __init__(self, faults: Iterable[Fault]):
        self.faults = tuple(faults)
        super().__init__("\n".join(say(fault) for fault in self.faults))


def fault(file: str, found: str, expected: str = "", hint: str = "") -> Faults:
    """A `Faults` of one fault that concerns a whole file, ready to raise."""
    return Faults([Fault(Where(file), found, expected, hint)])


def say(fault: Fault) -> str:
    """The fault as a person reads it: place and sentence, the line with a caret below the span, the hint."""
    at = fault.where
    place = ":".join(str(part) for part in (at.file, at.line, at.column) if part != 0)
    lines = [f"{place}: {fault.found}" + (f"; expected {fault.expected}" if fault.expected else "")]
    if at.line and at.text:
        margin = max(5, len(str(at.line)) + 2)
        shown, column = _window(at.text.expandtabs(1), at.column)
        lines.append(f"{at.line:>{margin}} | {shown}")
        if at.column:
            lines.append(f"{'':>{margin}} | {'':>{column - 1}}{'^' * min(max(1, at.width), max(1, len(shown) - column + 1))}")
    if fault.hint:
        lines.append(f"   {fault.hint}")
    return "\n".join(lines)


def _window(text: str, column: int, widest: int = 160) -> tuple[str, int]:
    """The part of a long line round `column`, and the column's place in it; control characters made visible."""
    first = max(0, min(column - widest // 2, len(text) - widest)) if len(text) > widest else 0
    shown = "".join(c if c.isprintable() else "\N{REPLACEMENT CHARACTER}" for c in text[first : first + widest])
    return shown, max(1, column - first)


def nearest(name: str, known: Iterable[str]) -> str:
    """A hint that offers the known name most like a misspelt one, or nothing when none is near."""
    found = get_close_matches(name, list(known), n=1, cutoff=0.6)
    return f"did you mean '{found[0]}'?" if found else ""
