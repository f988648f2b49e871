"""A rig file's text as values that know where they stand, and what is wrong with them as faults at the right spot."""

import re
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

from composer.faults import Fault, Faults, Where
from composer.rig.lines import Path, Place, Spot, find_places
from composer.rig.schema import MOST_BYTES, MOST_DOTS, MOST_FAULTS, MOST_LINE, MOST_LINES
from composer.rig.syntax import syntax_fault

_CHAIN = re.compile(rf"""(?<![\w-])(?:(?:[\w-]+|"[^"]*"|'[^']*')[ \t]*\.[ \t]*){{{MOST_DOTS}}}""")


@dataclass(slots=True)
class Document:
    """A TOML text as values, with the place of each; faults found in it gather here."""

    file: str
    lines: list[str]
    values: dict[str, Any]
    places: dict[Path, Place]
    faults: list[Fault] = field(default_factory=list)

    def place(self, path: Path) -> Place:
        """The place of a path, or of the innermost table round it that the text has."""
        while path and path not in self.places:
            path = path[:-1]
        return self.places.get(path, Place(Spot(0, 0, 0), Spot(0, 0, 0)))

    def line(self, path: Path) -> int:
        """The line that a path's key or header stands on."""
        return self.place(path).key.line

    def where(self, spot: Spot) -> Where:
        """A spot as a place for a message, with the text of its line."""
        text = self.lines[spot.line - 1] if spot.line else ""
        return Where(self.file, spot.line, spot.column, max(1, spot.width), text)

    def at_key(self, path: Path, found: str, expected: str = "", hint: str = "") -> None:
        """Add a fault at the key, or at the header of a table."""
        self._add(Fault(self.where(self.place(path).key), found, expected, hint))

    def at_value(self, path: Path, found: str, expected: str = "", hint: str = "") -> None:
        """Add a fault at the value."""
        self._add(Fault(self.where(self.place(path).value), found, expected, hint))

    def _add(self, fault: Fault) -> None:
        """Keep a fault; too many are enough to stop, since nobody reads them and hints take time."""
        self.faults.append(fault)
        if len(self.faults) >= MOST_FAULTS:
            self.faults = list(dict.fromkeys(self.faults))
        if len(self.faults) >= MOST_FAULTS:
            self.faults.append(Fault(Where(self.file), f"{MOST_FAULTS} faults so far; the rest is not looked at"))
            self.raise_faults()

    def raise_faults(self) -> None:
        """Raise all faults so far, in the file's order, each said once."""
        if self.faults:
            once = list(dict.fromkeys(self.faults))
            last = once[MOST_FAULTS:]
            raise Faults(sorted(once[:MOST_FAULTS], key=lambda f: (f.where.line, f.where.column)) + last)


def open_document(text: str, file: str, what: str = "rig file") -> Document:
    """Read TOML text into a document; raises `Faults` for text that is too long or no TOML, at line and column.

    `what` is how messages call the file.
    """
    size = len(text.encode("utf-8", "surrogatepass"))
    if size > MOST_BYTES:
        raise Faults([Fault(Where(file), f"the {what} has {size} bytes", f"at most {MOST_BYTES}")])
    lines = text.replace("\r\n", "\n").split("\n")
    if len(lines) > MOST_LINES:
        raise Faults([Fault(Where(file), f"the {what} has {len(lines)} lines", f"at most {MOST_LINES}")])
    for number, line in enumerate(lines, 1):
        if len(line) > MOST_LINE:
            where = Where(file, number, MOST_LINE + 1, 1, line)
            hint = "a list may run over several lines"
            raise Faults([Fault(where, f"a line of {len(line)} characters", f"at most {MOST_LINE} in a line", hint)])
        # The TOML reader takes time with the square of a key's parts.
        if line.count(".") >= MOST_DOTS and _CHAIN.search(line):
            raise Faults([Fault(Where(file, number, 0, 1, line), f"a key of more than {MOST_DOTS} parts", "a name")])
    try:
        values = tomllib.loads(text)
        return Document(file, lines, values, find_places("\n".join(lines)))
    except RecursionError:
        raise Faults(
            [Fault(Where(file), "lists or tables within one another, too deep to read", "lists of numbers or names")]
        ) from None
    except ValueError as error:
        raise Faults([syntax_fault(str(error), file, lines)]) from None


def say_value(value: Any) -> str:
    """A value as a message shows it: as the file would have it, shortened."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        shown = f'"{value}"'
    elif isinstance(value, Mapping):
        return "a table"
    elif isinstance(value, list):
        shown = "[" + ", ".join(say_value(item) for item in value[:6]) + (", …" if len(value) > 6 else "") + "]"
    else:
        shown = str(value) if not isinstance(value, int) or abs(value) < 10**40 else "a number of more than 40 digits"
    return shown if len(shown) <= 60 else shown[:59] + "…"


def say_names(names: Iterable[str], most: int = 12) -> str:
    """Names in quotes with commas, the first `most` of them."""
    every = list(names)
    return ", ".join(f"'{name}'" for name in every[:most]) + (f" and {len(every) - most} more" if len(every) > most else "")
