"""The words of the language, each once: messages, the manual and the editor's colours and completions read these tables."""

from dataclasses import dataclass

from composer.shapes import NAMES as SHAPES


@dataclass(frozen=True, slots=True)
class Word:
    """A word that opens a statement or an option: how it is written, what it means."""

    name: str
    form: str
    says: str


STATEMENTS: dict[str, Word] = {
    word.name: word
    for word in (
        Word("title", 'title "NAME"', "what the score is called"),
        Word("rig", "rig FILE", "the rig that it is for, path relative to the score"),
        Word("meter", "meter N/V [at BAR:1]", "counts in a bar, and the note value of a count"),
        Word("tempo", "tempo N [at PLACE]", "counts a minute, from there on"),
        Word("tempo to", "tempo N to M from PLACE to PLACE", "a change of tempo, linear over the counts"),
        Word("group", "group NAME = FIBERS", "a name for a selection of fibers"),
        Word("use", "use FILE", "brings the phrases and groups of another file"),
        Word("keep", "keep clock|rhythm", "what retiming protects"),
        Word("pin", "pin PLACE [every D until PLACE] [within D]", "an instant that retiming must not move"),
        Word("cue", 'cue "NAME" at PLACE [wait]', "a named place; with wait the player holds there"),
        Word("phrase", "phrase NAME [D]", "movement without a fiber; its lines are indented below it"),
        Word(
            "section",
            "section NAME at PLACE [times N every D] [keep clock|rhythm] [firm K]",
            "who moves when; its entries are indented below it",
        ),
    )
}

OPTIONS: dict[str, Word] = {
    word.name: word
    for word in (
        Word("at", "at PLACE", "starts at a place"),
        Word("after", "after D", "starts so long after the section's start"),
        Word("times", "times N [every D]", "N repeats, D apart, or the phrase's length apart"),
        Word("canon", "canon D [from end|middle|edges]", "each fiber D after the one before"),
        Word("ripple", "ripple V m/s along x|y|z", "each fiber when a wave reaches its place in the rig"),
        Word("scale", "scale K", "targets times K"),
        Word("stretch", "stretch K", "offsets times K"),
        Word("retrograde", "retrograde", "the phrase's curve backwards"),
        Word("mirror", "mirror", "played by each fiber's mirror partner"),
        Word("scatter", "scatter D seed N", "each fiber off by up to D either way, the same for the same seed"),
        Word("add", "add", "added to the lower entries instead of taking over from them"),
        Word("firm", "firm K", "its moves are K times as costly to retime"),
    )
}

MANNERS: dict[str, Word] = {
    word.name: word
    for word in (
        Word("over", "over D", "the move takes D and starts that long before its line"),
        Word("quiver", "quiver F Hz by A", "a sine of frequency F and amplitude A on top, from the line before to this one"),
    )
}

TARGETS = ("rest", "full", "hold")

SAMPLES: dict[str, str] = {
    "NUMBER": "a number such as 3, 0.75, 3/4 or 2+1/2",
    "INTEGER": "a whole number such as 4",
    "DURATION": "a duration such as 2, 1/2, 1.5s or 2bars",
    "PLACE": "a place such as 5:1, 5:2+1/2 or 12.4s",
    "TARGET": "a target such as 0.6, 12%, 8mm, 90deg, rest, full or hold",
    "HERTZ": "a frequency such as 4Hz",
    "SPEED": "a speed such as 0.8 m/s",
    "SIGNATURE": "a meter such as 4/4",
    "NAME": "a name (letters, digits, '_', '-', '.'; a letter first)",
    "PHRASE_NAME": "a phrase's name",
    "SELECTION": "a fiber, group, range such as reed.1-8 or wildcard such as reed.*",
    "STRING": 'a text in quotes such as "Estuary"',
    "PATH": "a file's path",
    "_COMMA": "a comma",
    "_EQUALS": "'='",
    "$END": "the end of the line",
}
"""What each kind of token is to a reader."""

FAMILIES: tuple[tuple[str, tuple[str, ...]], ...] = (
    ("a statement", tuple(name for name in STATEMENTS if " " not in name)),
    ("a shape", SHAPES),
    ("an option", tuple(OPTIONS)),
)
"""Words that are named together where all of them could stand."""

KEYWORDS: frozenset[str] = (
    frozenset({"to", "from", "until", "within", "wait", "clock", "rhythm", "by", "every"})
    | {"end", "middle", "edges", "along", "x", "y", "z", "seed"}
    | {name for _, family in FAMILIES for name in family}
    | set(MANNERS)
    | set(TARGETS)
)
"""Every word of the language."""

UNITS: dict[str, tuple[str, int]] = {
    "": ("counts", 1), "s": ("s", 1), "ms": ("s", 1000), "bar": ("bars", 1), "bars": ("bars", 1),
}  # fmt: skip
"""Units of a duration: what the model calls it, and how many of the written make one of those."""

TARGET_UNITS = {"": "stroke", "%": "%", "mm": "mm", "deg": "deg"}
"""Units of a target, as written and in the model."""
