"""A score as written: every number with the span of text that gives it, so that an editor can rewrite that span alone."""

from dataclasses import dataclass
from fractions import Fraction


@dataclass(frozen=True, slots=True)
class Span:
    """Characters `column` to before `end` of a line; line and columns count from 1."""

    file: str
    line: int
    column: int
    end: int


Spans = tuple[tuple[str, Span], ...]
"""The spans of a statement's own numbers, names and words, by what they are; `composer.score.spans` looks them up."""


@dataclass(frozen=True, slots=True)
class Duration:
    """A length of time: `value` in `unit` "counts", "s" or "bars"."""

    value: Fraction
    unit: str
    span: Span


@dataclass(frozen=True, slots=True)
class Place:
    """A place in the score: bar and count, both from 1, or `seconds` from its start (then bar is 0)."""

    bar: int
    count: Fraction
    seconds: Fraction | None
    span: Span


@dataclass(frozen=True, slots=True)
class Target:
    """How far: `value` in `unit` "stroke" (share of usable stroke), "%" (strain), "mm", "deg", or "hold" (value 0)."""

    value: Fraction
    unit: str
    span: Span


@dataclass(frozen=True, slots=True)
class Quiver:
    """A sine of `hertz` and amplitude `by` on top of a line's way there."""

    hertz: Fraction
    by: Target
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Line:
    """One line of a phrase; `over` None: starts at the line before; `controls`: the inner control values of `curve`."""

    offset: Duration
    target: Target
    shape: str
    over: Duration | None
    controls: tuple[Target, ...]
    quiver: Quiver | None
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Phrase:
    """Movement without a fiber; `length` as declared, None where it ends with its last line."""

    name: str
    length: Duration | None
    lines: tuple[Line, ...]
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Name:
    """A name as written, not yet looked up: fiber, group, range or wildcard."""

    text: str
    span: Span


@dataclass(frozen=True, slots=True)
class Repeat:
    """`times` repeats, `every` apart (None: the phrase's length)."""

    times: int
    every: Duration | None
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Canon:
    """Each fiber `delay` after the one before, `origin` "start", "end", "middle" or "edges"."""

    delay: Duration
    origin: str
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Ripple:
    """A wave of `speed` m/s (negative: the other way) along axis 0, 1 or 2 (x, y, z)."""

    speed: Fraction
    axis: int
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Scatter:
    """Each fiber off by up to `within` either way, the same for the same seed."""

    within: Duration
    seed: int
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Entry:
    """Fibers and a phrase, with options; None or the neutral value where an option is not written.

    firm: how many times as costly its moves are to retime
    """

    fibers: tuple[Name, ...]
    phrase: Name
    at: Place | None
    after: Duration | None
    repeat: Repeat | None
    canon: Canon | None
    ripple: Ripple | None
    scale: Fraction
    stretch: Fraction
    retrograde: bool
    mirror: bool
    scatter: Scatter | None
    add: bool
    firm: Fraction
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Section:
    """Entries from a place on, the whole repeated if `repeat`; keep "" where the score's own rule holds."""

    name: str
    at: Place
    repeat: Repeat | None
    keep: str
    firm: Fraction
    entries: tuple[Entry, ...]
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Meter:
    """`counts` in a bar from `at` on (None: from the start); `note` is the note value of a count's denominator."""

    counts: int
    note: int
    at: Place | None
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Tempo:
    """`rate` counts a minute from `at` on (None: from the start); with `to`, in a straight line over counts up to `until`."""

    rate: Fraction
    to: Fraction | None
    at: Place | None
    until: Place | None
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Group:
    """A named selection of fibers; a group may name other groups."""

    name: str
    members: tuple[Name, ...]
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Pin:
    """An instant that must not move, repeated `every` until a place; `within`: the give it has, None for none."""

    at: Place
    every: Duration | None
    until: Place | None
    within: Duration | None
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Cue:
    """A named place; with `wait` the player holds there until told to go on."""

    name: str
    at: Place
    wait: bool
    span: Span
    spans: Spans = ()


@dataclass(frozen=True, slots=True)
class Score:
    """A whole score; `phrases` and `groups` hold those of the files it uses too. `rig` is the path as written."""

    file: str
    title: str
    rig: Name | None
    meters: tuple[Meter, ...]
    tempi: tuple[Tempo, ...]
    groups: dict[str, Group]
    keep: str
    pins: tuple[Pin, ...]
    cues: tuple[Cue, ...]
    phrases: dict[str, Phrase]
    sections: tuple[Section, ...]
    lines: dict[str, tuple[str, ...]]
    """The text of each file, by name as in spans, a line each: for messages."""
    spans: Spans = ()
