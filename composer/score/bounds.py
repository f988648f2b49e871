"""What a score may hold at most, and the ranges of its numbers: reader, expansion, messages and manual read these tables."""

from dataclasses import dataclass
from fractions import Fraction


@dataclass(frozen=True, slots=True)
class Bound:
    """The most that a score may have of something."""

    name: str
    most: int
    says: str


BOUNDS: dict[str, Bound] = {
    bound.name: bound
    for bound in (
        Bound("file", 8 * 1024 * 1024, "bytes in a file"),
        Bound("lines", 200_000, "lines in a file"),
        Bound("line", 100_000, "characters in a line"),
        Bound("digits", 18, "digits in a row in a number"),
        Bound("depth", 8, "files deep that `use` may lead"),
        Bound("files", 64, "files that a score may use"),
        Bound("nesting", 64, "groups within one another"),
        Bound("repeats", 100_000, "repeats of an entry or a section"),
        Bound("moves", 4_000_000, "moves once every entry is written out for every fiber"),
        Bound("faults", 1000, "faults listed for one score"),
    )
}


def most(name: str) -> int:
    """The bound of that name."""
    return BOUNDS[name].most


@dataclass(frozen=True, slots=True)
class Range:
    """The range of a number as written; with `above` the lower end itself is not allowed."""

    name: str
    low: Fraction
    high: Fraction
    above: bool
    says: str

    def holds(self, value: Fraction) -> bool:
        """Whether a value lies within."""
        over, under = value.numerator, value.denominator  # in whole numbers: this is asked of every number of a score
        low, high = self.low.numerator * under, self.high.numerator * under
        over_low, over_high = over * self.low.denominator, over * self.high.denominator
        return (low < over_low if self.above else low <= over_low) and over_high <= high

    @property
    def told(self) -> str:
        """The range in words."""
        if self.above:
            return f"more than {_plain(self.low)}, at most {_plain(self.high)}"
        return f"{_plain(self.low)} to {_plain(self.high)}"


def _plain(value: Fraction) -> str:
    return str(value.numerator) if value.denominator == 1 else f"{float(value):g}"


def _range(name: str, low: float | str, high: int, says: str, *, above: bool = False) -> Range:
    return Range(name, Fraction(low), Fraction(high), above, says)


RANGES: dict[str, Range] = {
    row.name: row
    for row in (
        _range("offset", 0, 1_000_000, "a line's offset from its phrase's start, in its own unit"),
        _range("over", 0, 1_000_000, "the time that a move takes; a jump is written `step`", above=True),
        _range("length", 0, 1_000_000, "a phrase's length", above=True),
        _range("after", 0, 1_000_000, "an entry's start from its section's start"),
        _range("every", 0, 1_000_000, "the time from one repeat to the next", above=True),
        _range("canon", 0, 1_000_000, "the time from one fiber to the next"),
        _range("scatter", 0, 1_000_000, "how far a fiber may be off, either way"),
        _range("within", 0, 1_000_000, "the give of a pin"),
        _range("bar", 1, 100_000, "a bar"),
        _range("count", 1, 65, "a count of a bar, below the next bar's first"),
        _range("seconds", 0, 1_000_000, "a place in seconds from the score's start"),
        _range("tempo", 1, 1000, "counts a minute"),
        _range("counts", 1, 64, "counts in a bar"),
        _range("note", 1, 64, "the note value of a count: 1, 2, 4, 8, 16, 32 or 64"),
        _range("times", 1, most("repeats"), "repeats"),
        _range("target", 0, 100_000, "a target, in its own unit"),
        _range("control", -100_000, 100_000, "a curve's control value, in its own unit; the curve keeps within them"),
        _range("scale", 0, 1000, "what targets are multiplied with"),
        _range("stretch", "0.001", 1000, "what offsets are multiplied with"),
        _range("firm", "0.001", 1000, "how many times as costly to retime"),
        _range("ripple", "0.001", 1000, "a wave's speed in m/s, either way"),
        _range("quiver", "0.01", 100, "a quiver's frequency in Hz"),
        _range("by", 0, 100_000, "a quiver's amplitude, in its own unit", above=True),
        _range("seed", 0, 2**32 - 1, "a seed"),
    )
}
