"""Every word of the language in a sentence: from the reader's own tables, and what stands within their forms."""

from composer.score.words import MANNERS, OPTIONS, STATEMENTS, Word
from composer.shapes import SAYS as SHAPES

WITHIN: dict[str, Word] = {
    word.name: word
    for word in (
        Word("every", "every D", "how far apart the repeats are"),
        Word("from", "from end|middle|edges", "which fiber starts first; or where a change of tempo begins"),
        Word("end", "from end", "the last fiber starts first"),
        Word("middle", "from middle", "the fibers in the middle start first"),
        Word("edges", "from edges", "the fibers at both ends start first"),
        Word("along", "along x|y|z", "the direction in which the wave runs"),
        Word("x", "along x", "along the rig's x"),
        Word("y", "along y", "along the rig's y"),
        Word("z", "along z", "along the rig's z"),
        Word("seed", "seed N", "another number gives another scatter"),
        Word("by", "by A", "the amplitude of a quiver"),
        Word("to", "to", "the tempo, or the place, that the change leads to"),
        Word("until", "until PLACE", "the last of the repeated pins is at or before there"),
        Word("within", "within D", "the pin may give way by so much after all"),
        Word("wait", "wait", "the player holds here until the operator goes on"),
        Word("clock", "keep clock", "few moments move, the rest stay where they are"),
        Word("rhythm", "keep rhythm", "the time from one hit to the next is kept; what follows comes later as a whole"),
        Word("rest", "rest", "no strain at all: target 0"),
        Word("full", "full", "the whole usable stroke: target 1"),
        Word("hold", "hold", "the target that the fiber has already"),
    )
}
"""Words that stand within statements, options and lines."""

BARE: dict[str, Word] = {
    **WITHIN,
    **MANNERS,
    **{name: Word(name, name, f"{use}; progress {progress}") for name, (progress, use) in SHAPES.items()},
    **{name: word for name, word in STATEMENTS.items() if " " not in name},
    **{name: word for name, word in OPTIONS.items() if name not in STATEMENTS},
}
"""Every word, where it is not known in what."""

UNITS: dict[str, str] = {
    "s": "seconds, whatever the tempo",
    "ms": "milliseconds, whatever the tempo",
    "bar": "a bar, by the meter there",
    "bars": "bars, by the meter there",
    "%": "strain: change of length over rest length, in the fiber's own direction",
    "mm": "change of length in millimetres, in the fiber's own direction",
    "deg": "degrees of bend between the two ends, for a fiber that bends or coils",
    "Hz": "swings a second",
    "m/s": "metres a second",
}
"""Units as written, and what they mean."""


def word_at(word: str, block: str, first: bool) -> Word | None:
    """A word of the language where it stands: `at`, `times` and `keep` mean another thing in column 1 than in an entry."""
    if block == "statement" and first:
        return STATEMENTS.get(word)
    if block == "entry" and word in OPTIONS:
        return OPTIONS[word]
    if block == "statement" and word in ("times", "firm"):
        return OPTIONS[word]
    if block == "statement" and word == "at":
        return Word("at", "at PLACE", "where: bar and count, or seconds")
    return BARE.get(word)
