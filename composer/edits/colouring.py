"""The classes of a text's words, from the grammar's own tables, line by line, also of lines that are half-typed."""

from dataclasses import dataclass

CLASSES = (
    "statement", "option", "shape", "manner", "target", "word", "number", "place", "unit", "name", "phrase", "fiber", "text",
    "path", "mark", "comment", "wrong",
)  # fmt: skip
"""statement, option, shape, manner, target: words that open or are one; word: what belongs to one of them (`from`, `every`);
number with its unit's letters as `unit`; place: a bar and count; name: of a section or group; mark: a comma or "="; wrong: from
where the grammar stops making sense of a line."""

Coloured = tuple[int, int, str]
"""Characters `start` to before `end` of a line, from 0, and the class."""


@dataclass(frozen=True, slots=True)
class Colours:
    """The classes of a whole text: lines as text, the block each stands in ("statement", "move", "entry", ""), classes."""

    lines: tuple[str, ...]
    blocks: tuple[str, ...]
    classes: tuple[tuple[Coloured, ...], ...]


def colours_of(text: str, before: Colours | None = None) -> Colours:
    """The classes of every line; what `before` has of lines that are the same is taken from there."""
    raise NotImplementedError


def colour_line(line: str, block: str) -> tuple[Coloured, ...]:
    """The classes of one line that stands in a block: "statement" in column 1, "move", "entry", or "" where none is open."""
    raise NotImplementedError


def block_after(line: str, block: str) -> str:
    """The block ("move", "entry", "") that is open for indented lines after a line; `block` is what was open before it."""
    raise NotImplementedError
