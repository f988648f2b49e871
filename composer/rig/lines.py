"""Where everything stands in a TOML text: line and column of each table, key and value, by path.

`tomllib` gives values and forgets where they stood. This reads the same text once more, after the grammar of TOML 1.0.0
(toml.io/en/v1.0.0), and keeps nothing but places. It takes text that `tomllib` has accepted.
"""

import re
import tomllib
from dataclasses import dataclass

Path = tuple[str | int, ...]
"""Keys, and indices in arrays, from the document's root to a value."""


@dataclass(frozen=True, slots=True)
class Spot:
    """`width` characters of a line; line and column count from 1. Of what runs over lines, the part on its first."""

    line: int
    column: int
    width: int


@dataclass(frozen=True, slots=True)
class Place:
    """Where a key is written and where its value; for a table, both are its header or the key that first makes it."""

    key: Spot
    value: Spot


_BLANK = re.compile(r"[ \t]*")
_GAP = re.compile(r"(?:[ \t\n]|#[^\n]*)*")
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_STRING = re.compile(
    r'"""(?:[^\\"]|\\.|"(?!""))*"{3,5}' r"|'''(?:[^']|'(?!''))*'{3,5}" r'|"(?:[^"\\\n]|\\.)*"' r"|'[^'\n]*'",
    re.DOTALL,
)
_SCALAR = re.compile(r"[^,\]}#\n]+")


def find_places(text: str) -> dict[Path, Place]:
    """The place of every table, key and array element of a TOML text whose line ends are line feeds."""
    return _Finder(text).places


class _Finder:
    """One walk through the text; `at` is the index of the character to come."""

    def __init__(self, text: str):
        self.text = text
        self.at = 0
        self.places: dict[Path, Place] = {}
        self.rows: dict[Path, int] = {}
        self._line, self._start = 1, 0
        table: Path = ()
        while True:
            self.skip(_GAP)
            if self.at >= len(text):
                return
            if text[self.at] == "[":
                table = self.header()
            else:
                self.pair(table)

    def skip(self, pattern: re.Pattern[str]) -> int:
        """Pass what matches here; returns where it began."""
        begin = self.at
        found = pattern.match(self.text, begin)
        if found is None:
            raise ValueError(f"no TOML at character {begin}")
        self.at = found.end()
        return begin

    def spot(self, begin: int, end: int) -> Spot:
        """The spot of characters begin to end. Called with rising `begin`, so that lines are counted once."""
        breaks = self.text.count("\n", self._start, begin)
        if breaks:
            self._line += breaks
            self._start = self.text.rfind("\n", self._start, begin) + 1
        stop = self.text.find("\n", begin, end)
        return Spot(self._line, begin - self._start + 1, (stop if stop >= 0 else end) - begin)

    def note(self, path: Path, key: Spot, value: Spot) -> None:
        """Keep a place, unless the path has one: the first mention of a table counts."""
        self.places.setdefault(path, Place(key, value))

    def key(self) -> tuple[list[str], int, int]:
        """A dotted key: its parts, where it begins and ends."""
        parts: list[str] = []
        begin = self.at
        while True:
            start = self.skip(_STRING if self.text[self.at] in "\"'" else _BARE_KEY)
            written = self.text[start : self.at]
            parts.append(tomllib.loads("k=" + written)["k"] if written[0] in "\"'" else written)
            end = self.at
            self.skip(_BLANK)
            if self.text[self.at : self.at + 1] != ".":
                return parts, begin, end
            self.at += 1
            self.skip(_BLANK)

    def header(self) -> Path:
        """A [table] or [[row]] header; returns the path that the pairs below it belong to."""
        begin = self.at
        row = self.text.startswith("[[", begin)
        self.at += 2 if row else 1
        self.skip(_BLANK)
        parts, _, _ = self.key()
        self.at += 2 if row else 1
        spot = self.spot(begin, self.at)
        path: Path = ()
        for depth, part in enumerate(parts, 1):
            path += (part,)
            self.note(path, spot, spot)
            if row and depth == len(parts):
                self.rows[path] = self.rows.get(path, 0) + 1
            if path in self.rows:
                path += (self.rows[path] - 1,)
                self.note(path, spot, spot)
        if not row:
            # A table's own header tells more than the header of a table within it that came before.
            self.places[path] = Place(spot, spot)
        return path

    def pair(self, table: Path) -> None:
        """A key and its value."""
        parts, begin, end = self.key()
        key = self.spot(begin, end)
        self.at += 1
        self.skip(_BLANK)
        path = table
        for part in parts[:-1]:
            path += (part,)
            self.note(path, key, key)
        self.value((*path, parts[-1]), key)

    def value(self, path: Path, key: Spot | None) -> None:
        """A value of any type and all within it; an array's element is its own key."""
        begin = self.at
        line, start = self._line, self._start
        first = self.text[begin]
        self.places[path] = Place(key or Spot(0, 0, 0), Spot(0, 0, 0))
        if first in "\"'":
            self.skip(_STRING)
        elif first == "[":
            self.array(path)
        elif first == "{":
            self.inline(path)
        else:
            self.skip(_SCALAR)
            self.at = begin + len(self.text[begin : self.at].rstrip())
        ahead = self._line, self._start
        self._line, self._start = line, start
        spot = self.spot(begin, self.at)
        self._line, self._start = max(ahead, (self._line, self._start))
        self.places[path] = Place(key or spot, spot)

    def array(self, path: Path) -> None:
        """An array, its elements numbered from 0."""
        self.at += 1
        index = 0
        while True:
            self.skip(_GAP)
            if self.text[self.at] == "]":
                self.at += 1
                return
            self.value((*path, index), None)
            index += 1
            self.skip(_GAP)
            if self.text[self.at] == ",":
                self.at += 1

    def inline(self, path: Path) -> None:
        """An inline table; newer TOML lets it run over lines."""
        self.at += 1
        while True:
            self.skip(_GAP)
            if self.text[self.at] == "}":
                self.at += 1
                return
            self.pair(path)
            self.skip(_GAP)
            if self.text[self.at] == ",":
                self.at += 1
