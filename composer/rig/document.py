"""A rig file's text as values that know where they stand, and what is wrong with them as faults at the right spot."""

import re
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

from composer.faults import Fault, Faults, Where
from composer.rig.lines import Path, Place, Spot, find_places
from composer.rig.schema import MOST_BYTES, MOST_LINE


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
        self.faults.append(Fault(self.where(self.place(path).key), found, expected, hint))

    def at_value(self, path: Path, found: str, expected: str = "", hint: str = "") -> None:
        """Add a fault at the value."""
        self.faults.append(Fault(self.where(self.place(path).value), found, expected, hint))

    def raise_faults(self) -> None:
        """Raise all faults so far, in the file's order, each said once."""
        if self.faults:
            once = dict.fromkeys(self.faults)
            raise Faults(sorted(once, key=lambda f: (f.where.line, f.where.column)))


def open_document(text: str, file: str) -> Document:
    """Read TOML text into a document; raises `Faults` for text that is too long or no TOML, at line and column."""
    size = len(text.encode("utf-8", "surrogatepass"))
    if size > MOST_BYTES:
        raise Faults([Fault(Where(file), f"the rig file has {size} bytes", f"at most {MOST_BYTES}")])
    lines = text.replace("\r\n", "\n").split("\n")
    for number, line in enumerate(lines, 1):
        if len(line) > MOST_LINE:
            where = Where(file, number, MOST_LINE + 1, 1, line)
            hint = "a list may run over several lines"
            raise Faults([Fault(where, f"a line of {len(line)} characters", f"at most {MOST_LINE} in a line", hint)])
    try:
        values = tomllib.loads(text)
        return Document(file, lines, values, find_places("\n".join(lines)))
    except RecursionError:
        raise Faults(
            [Fault(Where(file), "lists or tables within one another, too deep to read", "no more than one list in another")]
        ) from None
    except ValueError as error:
        raise Faults([_syntax_fault(str(error), file, lines)]) from None


_POSITION = re.compile(r"^(.*?) \(at (?:line (\d+), column (\d+)|end of document)\)$", re.DOTALL)

_SAID: tuple[tuple[str, str, str, str], ...] = (
    ("Cannot overwrite a value", "this key is given twice in its table", "", "take one of them out"),
    ("Duplicate inline table key", "this key is given twice in its table", "", "take one of them out"),
    (
        "Cannot declare",
        "this table is here a second time",
        "",
        "write all its keys under one header; every name may be used once",
    ),
    ("Cannot mutate immutable namespace", "this table was closed before", "", "write all its keys in one place"),
    ("Cannot redefine namespace", "this table is here a second time", "", "write all its keys under one header"),
    ("Expected '=' after a key", "no '=' after the key", "KEY = VALUE", ""),
    ("Invalid statement", "this is no key, table or comment", "KEY = VALUE, [TABLE], [[TABLE]] or # comment", ""),
    (
        "Invalid initial character for a key",
        "no key begins like this",
        "letters, digits, '_' or '-'",
        "put other names in quotes",
    ),
    ("Invalid value", "this is no value", 'a number, true, false, a "text" in quotes, or a [list]', ""),
    ("Expected newline or end of document", "something more after the value", "one KEY = VALUE in a line", ""),
    ("Unclosed array", "the list is not closed", "a ',' or a ']'", ""),
    ("Unclosed inline table", "the table in braces is not closed", "a ',' or a '}'", ""),
    ("Unterminated string", "the text has no closing quote", "", ""),
    ("Expected ']' at the end of a table declaration", "the table's header has no ']'", "[TABLE]", ""),
    ("Expected ']]' at the end of an array declaration", "the table's header has no ']]'", "[[TABLE]]", ""),
    ("Illegal character '\\n'", "the text runs past the end of its line", "a closing quote", ""),
)
"""What tomllib says, by its first words: what was found, what was expected, what to do."""


def _syntax_fault(said: str, file: str, lines: list[str]) -> Fault:
    """What tomllib said, at its line and column, in our words where there are some."""
    parts = _POSITION.match(said)
    message = parts[1] if parts else said
    if parts and parts[2]:
        line, column = min(int(parts[2]), len(lines)), int(parts[3])
    else:
        line = next((n for n in range(len(lines), 0, -1) if lines[n - 1].strip()), 1)
        column = len(lines[line - 1]) + 1
    text = lines[line - 1]
    if message.startswith("Cannot overwrite a value") or message.startswith("Duplicate inline"):
        # tomllib stands behind the value; the key is what the person wrote twice.
        column = len(text) - len(text.lstrip()) + 1 if "{" not in text else column
    width = 1
    if text.lstrip().startswith("[") and message.startswith("Cannot declare"):
        column, width = len(text) - len(text.lstrip()) + 1, max(1, len(text.split("#")[0].strip()))
    where = Where(file, line, min(column, len(text) + 1), width, text)
    for start, found, expected, hint in _SAID:
        if message.startswith(start):
            return Fault(where, found, expected, hint)
    return Fault(where, message[:1].lower() + message[1:])


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
