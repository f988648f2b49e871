"""One line on its way into the model: tokens with their spans, and the faults found while their values are read."""

from fractions import Fraction

from lark import Token, Tree

from composer.faults import Fault, Where
from composer.score.bounds import RANGES
from composer.score.model import Duration, Place, Span, Spans, Target
from composer.score.numbers import Unreadable, written
from composer.score.words import TARGET_UNITS, UNITS


class Row:
    """A line of a file; `faults` is the file's own list, `sound` turns false with this line's first fault."""

    def __init__(self, file: str, number: int, text: str, faults: list[Fault]):
        self.file = file
        self.number = number
        self.text = text
        self.sound = True
        self._faults = faults

    def span(self, token: Token) -> Span:
        """Where a token stands."""
        return Span(self.file, self.number, token.start_pos + 1, token.start_pos + 1 + len(token))

    def whole(self, body: str) -> Span:
        """Where the line's own text stands, without indent and comment."""
        return Span(self.file, self.number, len(body) - len(body.lstrip()) + 1, len(body) + 1)

    def fault(self, span: Span, found: str, expected: str = "", hint: str = "") -> None:
        """Note a fault of this line."""
        self.sound = False
        self._faults.append(Fault(where(span, self.text), found, expected, hint))

    def number_of(self, token: Token, what: str) -> Fraction:
        """A token's number in its own unit, held against the range of that name; its low end where it cannot be read."""
        limits = RANGES[what]
        try:
            value = written(str(token)).value
        except Unreadable as stop:
            self.fault(self.span(token), str(stop), f"{limits.says}, {limits.told}", stop.hint)
            return limits.low or Fraction(1)
        if not limits.holds(value):
            wrong = "is negative" if value < 0 else "is out of range"
            self.fault(self.span(token), f"'{token}' {wrong}", f"{limits.says}, {limits.told}")
        return value

    def duration(self, token: Token, what: str) -> Duration:
        """A token as a duration; milliseconds become seconds."""
        value = self.number_of(token, what)
        suffix = str(token).lstrip("-+/.0123456789")
        unit, scale = UNITS[suffix]
        return Duration(value if scale == 1 else value / scale, unit, self.span(token))

    def place(self, token: Token) -> Place:
        """A token as a place; whether its count is within its bar's meter is for the whole score to say."""
        text = str(token)
        if ":" not in text:
            return Place(0, Fraction(0), self.duration(token, "seconds").value, self.span(token))
        bar, _, count = text.partition(":")
        at = token.start_pos
        return Place(
            int(self.number_of(_part(bar, at), "bar")),
            self.number_of(_part(count, at + len(bar) + 1), "count"),
            None,
            self.span(token),
        )

    def target(self, tree: Tree, what: str = "target") -> Target:
        """A target's tree as a target."""
        token = tree.children[0]
        if token.type in ("REST", "FULL", "HOLD"):
            unit = "hold" if token.type == "HOLD" else "stroke"
            return Target(Fraction(token.type == "FULL"), unit, self.span(token))
        return Target(self.number_of(token, what), TARGET_UNITS[str(token).lstrip("-+/.0123456789")], self.span(token))

    def once(self, trees: list[Tree]) -> dict[str, Tree]:
        """Options by name; one that is written twice is a fault."""
        seen: dict[str, Tree] = {}
        for tree in trees:
            name = "shape" if tree.data == "curve" else str(tree.data)
            if name in seen:
                self.fault(self.span(tree.children[0]) if tree.children else self._nowhere(), f"{name} is written twice")
            seen.setdefault(name, tree)
        return seen

    def spans(self, **tokens: Token | None) -> Spans:
        """Named spans of those tokens that are there."""
        return tuple((name, self.span(token)) for name, token in tokens.items() if token is not None)

    def _nowhere(self) -> Span:
        return Span(self.file, self.number, 0, 0)


def _part(text: str, start: int) -> Token:
    return Token("NUMBER", text, start_pos=start)


def where(span: Span, text: str = "") -> Where:
    """A span as the place of a fault."""
    return Where(span.file, span.line, span.column, max(1, span.end - span.column), text)


def tokens_of(tree: Tree) -> dict[str, Token]:
    """A tree's own tokens by type, the first of each."""
    found: dict[str, Token] = {}
    for child in tree.children:
        if isinstance(child, Token):
            found.setdefault(child.type, child)
    return found
