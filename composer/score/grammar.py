"""One line of a score through the grammar: a tree of tokens, or what is wrong with it in a reader's words."""

import re
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache, lru_cache
from importlib.resources import files

from lark import Lark, Token, Tree
from lark.exceptions import UnexpectedInput

from composer.faults import nearest
from composer.score.words import FAMILIES, KEYWORDS, OPTIONS, SAMPLES, TARGET_UNITS, TARGETS, UNITS

STARTS = ("statement", "move", "entry")

_WORD = re.compile(r'"[^"]*"?|,|=|[^\s,="]+')


@dataclass(frozen=True, slots=True)
class Misfit:
    """Where a line stops making sense: column from 1, width, what stands there, what could, the nearest word."""

    column: int
    width: int
    found: str
    expected: str
    hint: str


@cache
def _grammar() -> Lark:
    """The parser's tables, built once a process."""
    text = files("composer.score").joinpath("grammar.lark").read_text(encoding="utf-8")
    return Lark(text, parser="lalr", lexer="contextual", start=list(STARTS), maybe_placeholders=False)


@lru_cache(maxsize=16384)
def parse_line(start: str, body: str) -> Tree | Misfit:
    """Parse one line without its comment; remembered by its text, so that a keystroke costs one line."""
    try:
        return _grammar().parse(body, start=start)
    except UnexpectedInput:
        return _misfit(start, body)


def body_of(text: str) -> str:
    """A line without its comment and trailing space: `#` inside quotes is no comment."""
    for match in re.finditer(r'"[^"]*"?|#', text):
        if match.group() == "#":
            return text[: match.start()].rstrip()
    return text.rstrip()


@dataclass(frozen=True, slots=True)
class Partly:
    """A line as far as it makes sense: its tokens, where it stops doing so (its length where it all does), what could stand
    there by the names of the grammar's tokens."""

    tokens: tuple[Token, ...]
    stop: int
    accepts: frozenset[str]


@lru_cache(maxsize=16384)
def parse_partly(start: str, body: str) -> Partly:
    """Parse one line without its comment, a token at a time, as far as it goes: for an editor, where lines are half-typed."""
    parser = _grammar().parse_interactive(body, start=start)
    tokens: list[Token] = []
    at = len(body)
    try:
        for token in parser.lexer_thread.lex(parser.parser_state):
            at = token.start_pos
            parser.feed_token(token)
            tokens.append(token)
            at = len(body)
    except UnexpectedInput as stop:
        if at == len(body):
            at = stop.pos_in_stream
    return Partly(tuple(tokens), at, frozenset(parser.accepts()))


def _misfit(start: str, body: str) -> Misfit:
    """Parse again, a token at a time, and ask the parser what it could have taken where it stopped."""
    found = parse_partly(start, body)
    at, accepts = found.stop, found.accepts
    match = _WORD.match(body, at)
    if at >= len(body):
        return Misfit(len(body) + 1, 1, "the line ends here", tell(accepts), "")
    word = match.group() if match else body[at]
    hint = _joined(start, body[:at], word) or _hint(word, accepts, body[:at])
    return Misfit(at + 1, len(word), _found(word), tell(accepts), hint)


def _found(word: str) -> str:
    shown = word if len(word) <= 40 else word[:39] + "…"
    if not word.isprintable():
        return f"character U+{ord(next(c for c in word if not c.isprintable())):04X} cannot stand in a score"
    if word[0].isalpha() and word not in KEYWORDS:
        return f"unknown word '{shown}'"
    return f"'{shown}' cannot stand here"


def _joined(start: str, before: str, word: str) -> str:
    """What to write where a number's unit stands apart from it, as in `every 3 bars`."""
    number = re.search(r"(?<!\S)-?[0-9][0-9./+]*\s+$", before)
    if number is None or (word not in UNITS and word not in TARGET_UNITS):
        return ""
    whole = number.group().rstrip() + word
    fits = parse_partly(start, before[: number.start()] + whole)
    return f"write number and unit together: {whole}" if fits.stop == number.start() + len(whole) else ""


def tell(accepts: Iterable[str]) -> str:
    """What could stand at a place, in a reader's words, from the grammar's tokens."""
    tokens = set(accepts)
    words = {token.lower() for token in tokens if token not in SAMPLES}
    parts = [SAMPLES[token] for token in SAMPLES if token in tokens and token != "$END"]
    if "TARGET" in tokens:
        words -= set(TARGETS)
    for name, family in FAMILIES:
        if set(family) <= words:
            parts.append(f"{name} ({', '.join(family)})")
            words -= set(family)
    parts += [f"'{word}'" for word in sorted(words)]
    if "$END" in tokens:
        parts.append(SAMPLES["$END"])
    return " or ".join([", ".join(parts[:-1]), parts[-1]] if len(parts) > 1 else parts)


def _hint(word: str, accepts: Iterable[str], before: str) -> str:
    words = [token.lower() for token in accepts if token not in SAMPLES]
    if word.lower() in words:
        return f"write '{word.lower()}' in small letters"
    if word.startswith('"') and (len(word) == 1 or not word.endswith('"')):
        return "the quotes are not closed"
    if any(c in "“”„«»‘’" for c in word):
        return 'write straight quotes: "'
    if any(c in "−–—" for c in word):
        return "write a plain minus: -"
    if "PHRASE_NAME" in accepts and word in OPTIONS:
        return f"'{word}' opens an option, so it cannot be a phrase's name; the phrase comes before the options"
    for token, unit in (("HERTZ", "Hz"), ("SPEED", " m/s")):
        if token in accepts and re.fullmatch(r"-?[0-9][0-9./+]*", word):
            return f"write its unit: {word}{unit}"
    if re.fullmatch(r"\.[0-9]+\D*", word):
        return f"write 0{word}"
    if word == "," and before[-1:].isdigit():
        return "write a point, not a comma, in a decimal"
    return nearest(word.lower(), words)
