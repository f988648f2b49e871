"""Which span of text gives a knot its time and its target, and how that span alone is rewritten."""

from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from composer.score.model import Duration, Entry, Line, Phrase, Place, Score, Section, Span, Target
from composer.score.numbers import write_like, write_place_like


@dataclass(frozen=True, slots=True)
class Handle:
    """One number of the text: what it does, where it stands, its value and unit.

    unit: "counts", "s" or "bars"; "stroke", "%", "mm", "deg" or "hold"; "m/s", "Hz"; "1" for a factor or a number of
        times; "place" for a bar and count (then `value` is the count and `bar` the bar; bar is 0 for other units)
    """

    role: str
    span: Span
    value: Fraction
    unit: str
    bar: int = 0


@dataclass(frozen=True, slots=True)
class Found:
    """What made a segment: section, entry, phrase, and the phrase's line (None where it stands in another file)."""

    section: Section
    entry: Entry
    phrase: Phrase
    line: Line | None


def span_of(thing: Any, name: str) -> Span | None:
    """The span of a word or number of a model object, by its name there: "name", "shape", "scale number" and so on."""
    return next((span for called, span in thing.spans if called == name), None)


def find(score: Score, line: int, phrase_line: int = 0, index: int | None = None) -> Found | None:
    """What stands in line `line` of the score (an entry) and in `phrase_line` of its phrase; None where no entry is there.

    phrase_line is 0 where the phrase comes from another file; `index` then tells which of its lines is meant.
    """
    for section in score.sections:
        for entry in section.entries:
            if entry.span.line == line:
                phrase = score.phrases.get(entry.phrase.text)
                if phrase is None:
                    return None
                if phrase_line:
                    lines = [one for one in phrase.lines if one.span.line == phrase_line]
                else:
                    lines = [] if index is None else list(phrase.lines[index : index + 1])
                return Found(section, entry, phrase, lines[0] if lines else None)
    return None


def gives_time(found: Found) -> Handle:
    """The number that gives a knot its time: its line's offset, or else the start of its entry or section."""
    return time_handles(found)[0]


def gives_target(found: Found) -> Handle | None:
    """The target that gives a knot its strain; None where the line stands in another file."""
    return None if found.line is None else _target("target", found.line.target)


def time_handles(found: Found) -> tuple[Handle, ...]:
    """Every number that has a say in when a knot is, the nearest first."""
    entry, section, line = found.entry, found.section, found.line
    handles: list[Handle | None] = [
        _duration("offset", line and line.offset),
        _place("at", entry.at),
        _duration("after", entry.after),
        _place("section at", section.at),
        _duration("over", line and line.over),
        _factor("stretch", entry, entry.stretch),
        _duration("canon", entry.canon and entry.canon.delay),
        _ripple(entry),
        _duration("scatter", entry.scatter and entry.scatter.within),
        _duration("every", entry.repeat and entry.repeat.every),
        _duration("section every", section.repeat and section.repeat.every),
    ]
    return tuple(handle for handle in handles if handle is not None)


def target_handles(found: Found) -> tuple[Handle, ...]:
    """Every number that has a say in how far a knot is, the nearest first."""
    line = found.line
    handles = [
        *([_target("target", line.target)] if line else []),
        *([_target(f"control {n}", c) for n, c in enumerate(line.controls, 1)] if line else []),
        *([_target("quiver by", line.quiver.by)] if line and line.quiver else []),
        _factor("scale", found.entry, found.entry.scale),
    ]
    return tuple(handle for handle in handles if handle is not None)


def players(score: Score, phrase: str) -> tuple[int, ...]:
    """The lines of all entries that play a phrase: all of them move when a number of the phrase is rewritten."""
    return tuple(e.span.line for s in score.sections for e in s.entries if e.phrase.text == phrase)


def text_at(text: str, span: Span) -> str:
    """The text of a span."""
    start = _start(text, span.line)
    return text[start + span.column - 1 : start + span.end - 1]


def rewrite(text: str, span: Span, new: str) -> str:
    """The text with one span replaced and nothing else touched."""
    start = _start(text, span.line)
    return text[: start + span.column - 1] + new + text[start + span.end - 1 :]


def rewrite_all(text: str, changes: Iterable[tuple[Span, str]]) -> str:
    """The text with several spans replaced; the spans must not overlap."""
    for span, new in sorted(changes, key=lambda change: (change[0].line, change[0].column), reverse=True):
        text = rewrite(text, span, new)
    return text


def set_value(text: str, handle: Handle, value: Fraction, bar: int = 0) -> str:
    """The text with a handle's number changed, in the form that it was written in; `bar` and `value` for a place."""
    old = text_at(text, handle.span)
    new = write_place_like(old, bar or handle.bar, value) if handle.unit == "place" else write_like(old, value)
    return rewrite(text, handle.span, new)


def _start(text: str, line: int) -> int:
    """Where a line begins in the text."""
    at = 0
    for _ in range(line - 1):
        at = text.index("\n", at) + 1
    return at


def _duration(role: str, duration: Duration | None) -> Handle | None:
    return duration and Handle(role, duration.span, duration.value, duration.unit)


def _target(role: str, target: Target) -> Handle:
    return Handle(role, target.span, target.value, target.unit)


def _place(role: str, place: Place | None) -> Handle | None:
    if place is None:
        return None
    if place.seconds is not None:
        return Handle(role, place.span, place.seconds, "s")
    return Handle(role, place.span, place.count, "place", place.bar)


def _factor(name: str, entry: Entry, value: Fraction) -> Handle | None:
    span = span_of(entry, f"{name} number")
    return span and Handle(name, span, value, "1")


def _ripple(entry: Entry) -> Handle | None:
    span = entry.ripple and span_of(entry.ripple, "speed")
    return span and Handle("ripple", span, entry.ripple.speed, "m/s")
