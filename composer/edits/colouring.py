"""The classes of a text's words, from the grammar's own tables, line by line, also of lines that are half-typed."""

import re
from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache

from lark import Token

from composer.score.bounds import most
from composer.score.grammar import Misfit, body_of, parse_line, parse_partly
from composer.score.words import KEYWORDS, MANNERS, OPTIONS, STATEMENTS, TARGETS
from composer.shapes import NAMES as SHAPES

CLASSES = (
    "statement", "option", "shape", "manner", "target", "word", "number", "place", "unit", "name", "phrase", "fiber", "text",
    "path", "mark", "comment", "wrong",
)  # fmt: skip
"""statement, option, shape, manner, target: words that open or are one; word: what belongs to one of them (`from`, `every`);
number with its unit's letters as `unit`; place: a bar and count; name: of a section or group; mark: a comma or "="; wrong:
the word at which a line stops making sense."""

Coloured = tuple[int, int, str]
"""Characters `start` to before `end` of a line, from 0, and the class."""

BLOCKS = {"phrase": "move", "section": "entry"}
"""What a statement opens for the indented lines below it, by the names of the grammar's starts."""

LONGEST = 4000
"""Characters of a line up to which it is parsed at every keystroke; the words of a longer one are what they look like."""

_VALUES = {
    "NUMBER": "number", "INTEGER": "number", "DURATION": "number", "TARGET": "number", "HERTZ": "number", "SPEED": "number",
    "SIGNATURE": "number", "PLACE": "place", "NAME": "name", "PHRASE_NAME": "phrase", "SELECTION": "fiber", "STRING": "text",
    "PATH": "path", "_COMMA": "mark", "_EQUALS": "mark",
}  # fmt: skip
"""Classes of the grammar's tokens that are no words of the language."""

_PIECE = re.compile(r'"[^"]*"?|,|=|[^\s,="]+')
_NUMBER = re.compile(r"-?[0-9][0-9.+/]*(?=$|[^0-9.+/:])")
_PLACE = re.compile(r"-?[0-9]+:[0-9.+/]*")


@dataclass(frozen=True, slots=True)
class Colours:
    """The classes of a whole text: lines as text, the block each stands in ("statement", "move", "entry", ""), classes."""

    lines: tuple[str, ...]
    blocks: tuple[str, ...]
    classes: tuple[tuple[Coloured, ...], ...]


def colours_of(text: str, before: Colours | None = None) -> Colours:
    """The classes of every line; what `before` has of lines that are the same is taken from there.

    A text with more lines than a score may have is coloured as far as that.
    """
    lines = tuple(text.split("\n", most("lines") + 1)[: most("lines") + 1])
    head = tail = 0
    if before is not None:
        shorter = min(len(lines), len(before.lines))
        while head < shorter and lines[head] == before.lines[head]:
            head += 1
        while tail < shorter - head and lines[-1 - tail] == before.lines[-1 - tail]:
            tail += 1
    blocks = list(before.blocks[:head]) if before else []
    classes = list(before.classes[:head]) if before else []
    open_ = block_after(lines[head - 1], _inside(blocks[-1])) if head else ""
    for at in range(head, len(lines)):
        block = block_of(lines[at], open_)
        # From a line on that stands in the block that it stood in, all else is as it was.
        if before is not None and at >= len(lines) - tail and not blank(lines[at]):
            was = at - len(lines) + len(before.lines)
            if before.blocks[was] == block:
                blocks += before.blocks[was:]
                classes += before.classes[was:]
                break
        blocks.append(block)
        classes.append(colour_line(lines[at], block))
        open_ = block_after(lines[at], open_)
    return Colours(lines, tuple(blocks), tuple(classes))


def _inside(block: str) -> str:
    return "" if block == "statement" else block


def blank(line: str) -> bool:
    """Whether a line says nothing: empty, or a comment alone."""
    return not body_of(line).strip()


def block_of(line: str, open_: str) -> str:
    """The block that a line stands in, where `open_` is what is open for indented lines."""
    return open_ if line[:1].isspace() or blank(line) else "statement"


def block_after(line: str, block: str) -> str:
    """The block ("move", "entry", "") that is open for indented lines after a line; `block` is what was open before it."""
    if line[:1].isspace() or blank(line):
        return block
    body = body_of(line)
    word = body.lstrip("\ufeff").split(maxsplit=1)[0]
    if word not in STATEMENTS:
        tree = parse_line("statement", body) if len(body) <= LONGEST else None
        if isinstance(tree, Misfit):
            word = tree.hint.removeprefix("did you mean '").removesuffix("'?")
    return BLOCKS.get(word, "")


def blocks_until(lines: list[str], line: int) -> str:
    """The block that line `line` (from 1) stands in."""
    if not 0 < line <= len(lines):
        return ""
    if not lines[line - 1][:1].isspace() and not blank(lines[line - 1]):
        return "statement"
    for above in reversed(lines[: line - 1]):
        if not above[:1].isspace() and not blank(above):
            return block_after(above, "")
    return ""


@lru_cache(maxsize=16384)
def colour_line(line: str, block: str) -> tuple[Coloured, ...]:
    """The classes of one line that stands in a block: "statement" in column 1, "move", "entry", or "" where none is open."""
    if len(line) > most("line"):
        return ()
    body = body_of(line)
    found: list[Coloured] = []
    if body.strip():
        shown = body.replace("\ufeff", " ")
        parsed = bool(block) and len(line) <= LONGEST
        tokens, stop = tokens_of(block, shown) if parsed else ((), 0)
        for number, token in enumerate(tokens):
            found += _token(token, class_of(token, block, number))
        found += _rest(shown, stop, parsed)
    comment = line.find("#", len(body))
    if comment >= 0:
        found.append((comment, len(line.rstrip("\r")), "comment"))
    return tuple(found)


def tokens_of(block: str, body: str) -> tuple[tuple[Token, ...], int]:
    """The tokens of a line as far as it makes sense, and where it stops doing so."""
    tree = parse_line(block, body)
    if isinstance(tree, Misfit):
        partly = parse_partly(block, body)
        return partly.tokens, partly.stop
    # What the reader has parsed is there already; of its marks the tree has none.
    tokens = sorted(tree.scan_values(lambda value: isinstance(value, Token)), key=lambda token: token.start_pos)
    marks, at = [], 0
    for token in (*tokens, None):
        end = len(body) if token is None else token.start_pos
        for mark in ",=":
            place = body.find(mark, at, end)
            if place >= 0:
                marks.append(Token("_COMMA" if mark == "," else "_EQUALS", mark, start_pos=place))
        at = end if token is None else end + len(token)
    return tuple(sorted((*tokens, *marks), key=lambda token: token.start_pos)), len(body)


def class_of(token: Token, block: str, number: int) -> str:
    """The class of a line's `number`th token."""
    if token.type in _VALUES:
        return _VALUES[token.type]
    word = token.type.lower()
    if block == "statement" and number == 0:
        return "statement"
    if word in ("times", "keep", "firm") or (block == "entry" and word in OPTIONS):
        return "option"
    return _plain(word)


def _plain(word: str) -> str:
    """The class of a word of the language wherever it stands."""
    for words, kind in ((SHAPES, "shape"), (MANNERS, "manner"), (TARGETS, "target")):
        if word in words:
            return kind
    return "word"


def _token(token: Token, kind: str) -> Iterator[Coloured]:
    start, text = token.start_pos, str(token)
    if kind == "number":
        digits = _NUMBER.match(text)
        middle = len(digits.group()) if digits else len(text)
        yield start, start + middle, "number"
        if middle < len(text):
            yield start + middle, start + len(text), "unit"
    else:
        yield start, start + len(text), kind


def _rest(body: str, stop: int, known: bool) -> Iterator[Coloured]:
    """What stands from where the grammar stops: its first word is wrong, the others are what they look like."""
    for number, match in enumerate(_PIECE.finditer(body, stop)):
        word = match.group()
        if number == 0 and known:
            yield match.start(), match.end(), "wrong"
        elif word in (",", "="):
            yield match.start(), match.end(), "mark"
        elif word.startswith('"'):
            yield match.start(), match.end(), "text"
        elif _PLACE.match(word):
            yield match.start(), match.end(), "place"
        elif digits := _NUMBER.match(word):
            yield match.start(), match.start() + digits.end(), "number"
            if digits.end() < len(word):
                yield match.start() + digits.end(), match.end(), "unit"
        elif word in KEYWORDS:
            kind = "option" if word in OPTIONS else "statement" if word in STATEMENTS else _plain(word)
            yield match.start(), match.end(), kind
