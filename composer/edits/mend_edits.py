"""Edits that mend: a move given time, let leave earlier, asked for less; an instant pinned."""

from dataclasses import dataclass
from fractions import Fraction
from math import ceil, floor

import numpy as np

from composer.edits.copying import copied, entry_at, inserted, new_name
from composer.edits.edit import Change, Edit, Refusal, change_at, edit_of, line_starts
from composer.edits.instances import Instances, instances_of
from composer.edits.made import Made
from composer.edits.rewriting import place_text
from composer.edits.saying import Word, in_unit, phrase_words
from composer.edits.values import counts_from_place, form_of
from composer.score.expand_lines import parts
from composer.score.model import Duration, Entry, Phrase, Section, Span
from composer.score.numbers import write_like, write_place_like
from composer.score.spans import Found, span_of, text_at, time_handles

UP = Fraction(1, 100)
"""What a number that gives more time is rounded up to: counts, seconds or bars."""

UP_FRACTION = Fraction(1, 16)
"""The same where the move's own number is written as a fraction."""


@dataclass(frozen=True, slots=True)
class Spot:
    """A move of the score: section, entry and phrase, which of the phrase's lines it goes to, its fiber's own stretch."""

    section: Section
    entry: Entry
    phrase: Phrase
    at: int
    from_s: float
    to_s: float


def spot_of(made: Made, fiber: int, knot: int) -> Spot | None:
    """The move that a segment is, or is part of; None where none of the score's lines made it."""
    tracks = made.tracks
    mine = np.arange(len(made.rig.fibers)) == fiber
    all_, _ = instances_of(made.score, made.rig, made.abilities, made.tempo, mine)
    begin = float(tracks.time_s[knot])
    end = float(tracks.time_s[knot + 1]) if knot + 1 < tracks.first[fiber + 1] else begin
    lines = all_.entry_line[all_.instance]
    over = (all_.leaves_s <= 0.5 * (begin + end) + 1e-9) & (all_.stops_s >= 0.5 * (begin + end) - 1e-9) & all_.goes
    rows = np.flatnonzero(over & (lines == tracks.line[knot]))
    rows = rows if len(rows) else np.flatnonzero(over)
    if not len(rows):
        return None
    row = int(rows[0])
    return _spot(made, all_, row)


def _spot(made: Made, all_: Instances, row: int) -> Spot | None:
    which = int(all_.instance[row])
    entry, phrase = all_.entries[int(all_.entry[which])], all_.phrases[int(all_.variant[which])]
    line = all_.written[int(all_.row[row])]
    at = next((n for n, one in enumerate(phrase.lines) if one is line), -1)
    found = entry_at(made.score, entry.span.line)
    if found is None or at < 0:
        return None
    return Spot(found[0], entry, phrase, at, float(all_.leaves_s[row]), float(all_.stops_s[row]))


def give_time(text: str, made: Made, spot: Spot, more_s: float) -> Edit | Refusal:
    """The move lands later, and what follows in its phrase as much later; the phrase copied where others play it too."""
    if spot.entry.retrograde:
        return Refusal("The phrase is played backwards here, so its numbers mean other moves: let the retimer do this hit.")
    words, said = [], ""
    for n, line in enumerate(spot.phrase.lines[spot.at :], spot.at):
        by = _up(made, spot, more_s, line.offset.unit)
        words.append((n, "offset", _later(made, line.offset, by)))
        said = said or f"{_written(made, line.offset)} to {words[-1][2]}"
        if n == spot.at and line.over is not None:
            words.append((n, "over", _later(made, line.over, _up(made, spot, more_s, line.over.unit))))
    words += _length(made, spot, more_s)
    return edit_of(phrase_changes(text, made, spot, words), f"{spot.phrase.name}: {said}, the rest as much later")


def let_lead(text: str, made: Made, spot: Spot, more_s: float) -> Edit | Refusal:
    """The move lands where it does and leaves earlier, out of the hold before it."""
    if spot.entry.retrograde:
        return Refusal("The phrase is played backwards here, so its numbers mean other moves: let the retimer do this hit.")
    lines, at = spot.phrase.lines, spot.at
    line, before = lines[at], lines[at - 1] if at else None
    words: list[Word] = []
    holds = before is not None and before.target.unit == "hold" and at > 1
    if holds:
        sooner = before.offset.value - _up(made, spot, more_s, before.offset.unit)
        if before.offset.unit == lines[at - 2].offset.unit and sooner <= lines[at - 2].offset.value:
            return Refusal("The hold before it is too short for it to leave that much earlier.")
        words.append((at - 1, "offset", write_like(_written(made, before.offset), sooner)))
    if line.over is not None:
        words.append((at, "over", _later(made, line.over, _up(made, spot, more_s, line.over.unit))))
        return edit_of(phrase_changes(text, made, spot, words), f"{spot.phrase.name}: over {words[-1][2]}")
    if holds:
        return edit_of(phrase_changes(text, made, spot, words), f"{spot.phrase.name}: hold until {words[0][2]}")
    if before is not None and any(parts(before.offset)):
        return Refusal("The move before it lands where this one leaves, so it cannot leave earlier.")
    # The first move: the entry starts earlier, and every line is as much later in the phrase.
    counts = float(_up(made, spot, more_s, "counts")) * float(spot.entry.stretch)
    begins = float(made.tempo.counts(spot.from_s))
    start = _earlier(text, made, spot, counts)
    if isinstance(start, Refusal):
        return start
    real_s = spot.from_s - float(made.tempo.seconds(begins - counts))

    def by(unit: str) -> Fraction:
        exact = in_unit(made.tempo, spot.from_s - real_s, spot.from_s, unit) / float(spot.entry.stretch)
        return Fraction(exact).limit_denominator(1_000_000)

    words += [
        (n, "offset", _later(made, one.offset, by(one.offset.unit))) for n, one in enumerate(lines) if any(parts(one.offset))
    ]
    if spot.phrase.length is not None:
        length = spot.phrase.length
        words.append((-1, "length", _later(made, length, ceil(by(length.unit) / UP) * UP)))
    changes = [*phrase_changes(text, made, spot, words), start]
    return edit_of(changes, f"line {spot.entry.span.line}: starts {counts:g} counts earlier, lands where it did")


def ask_less(text: str, made: Made, entries: list[Entry], share: float) -> Edit | Refusal:
    """Entries scaled by a share of what they were."""
    share = floor(share * 100.0 + 1e-9) / 100.0
    if share < 0.05:
        return Refusal("There would be nothing left of it.")
    changes: list[Change] = []
    for entry in entries:
        span = span_of(entry, "scale number")
        value = entry.scale * Fraction(round(share * 100), 100)
        if span is None:
            changes.append((*_end(text, entry.span), f" scale {write_like('1.00', value)}"))
        else:
            changes.append(change_at(text, span, write_like(text_at(text, span), value)))
    lines = ", ".join(str(entry.span.line) for entry in entries[:4]) + (", …" if len(entries) > 4 else "")
    return edit_of(changes, f"{share:g} of the way in {'line' if len(entries) == 1 else 'lines'} {lines}")


def quiver_less(text: str, made: Made, spot: Spot, share: float) -> Edit | Refusal:
    """A line's quiver made smaller."""
    line = spot.phrase.lines[spot.at]
    if line.quiver is None or line.span.file != made.score.file:
        return Refusal("The quiver is not written on this move's line in this file.")
    by = line.quiver.by
    value = Fraction(floor(float(by.value) * share * 1000.0), 1000)
    if value <= 0:
        return Refusal("There would be nothing left of the quiver: take it out.")
    return edit_of([change_at(text, by.span, write_like(text_at(text, by.span), value))], f"quiver by {float(value):g}")


def pin_here(text: str, made: Made, at_s: float) -> Edit:
    """An instant pinned, in a line behind the pins that there are, else before the first section."""
    place = place_text(float(made.tempo.counts(at_s)), made)
    starts = line_starts(text)
    ending = "\r\n" if "\r\n" in text else "\n"
    after = max((pin.span.line for pin in made.score.pins), default=0)
    if not after:
        heads = [one.span.line for one in (*made.score.meters, *made.score.tempi)]
        heads += [made.score.rig.span.line] if made.score.rig else []
        after = max(heads, default=0)
    if after < len(starts):
        return edit_of([(starts[after], starts[after], f"pin {place}{ending}")], f"pin {place}")
    return edit_of([(len(text), len(text), f"{ending}pin {place}")], f"pin {place}")


def no_step(text: str, made: Made, spot: Spot) -> Edit | Refusal:
    """A jump that is a move as fast as can be instead."""
    line = spot.phrase.lines[spot.at]
    span = next((span for name, span in line.spans if name == "shape"), None)
    if line.shape != "step" or span is None or span.file != made.score.file:
        return Refusal("The fiber is elsewhere when this phrase begins: bring it there first, or leave the line at 0 out.")
    return edit_of([change_at(text, span, "sudden")], f"'sudden' in place of 'step' (line {span.line})")


def phrase_changes(text: str, made: Made, spot: Spot, words: list[Word]) -> list[Change]:
    """Numbers of a phrase changed for one entry: in place where it alone plays it, else in a copy."""
    score, phrase = made.score, spot.phrase
    spans, _ = phrase_words(phrase, tuple(words))
    players = [e for s in score.sections for e in s.entries if e.phrase.text == phrase.name]
    if len(players) == 1 and phrase.span.file == score.file:
        return [change_at(text, span, new) for span, new in spans]
    name = new_name(score, phrase.name, spot.section.name)
    copy = inserted(text, score, phrase, copied(score, phrase, name, spans), spot.section)
    return [copy, change_at(text, spot.entry.phrase.span, name)]


def _up(made: Made, spot: Spot, more_s: float, unit: str) -> Fraction:
    """More time in a unit of the phrase, rounded up."""
    value = in_unit(made.tempo, spot.to_s, spot.to_s + more_s, unit) / float(spot.entry.stretch)
    form = form_of(_written(made, spot.phrase.lines[spot.at].offset))
    step = UP_FRACTION if form in ("fraction", "mixed") else UP
    return ceil(Fraction(value) / step) * step


def _written(made: Made, duration: Duration) -> str:
    span = duration.span
    return made.score.lines[span.file][span.line - 1][span.column - 1 : span.end - 1]


def _later(made: Made, duration: Duration, by: Fraction) -> str:
    return write_like(_written(made, duration), duration.value + by)


def _length(made: Made, spot: Spot, more_s: float) -> list[Word]:
    """The phrase's declared length, longer by as much."""
    length = spot.phrase.length
    return [] if length is None else [(-1, "length", _later(made, length, _up(made, spot, more_s, length.unit)))]


def _earlier(text: str, made: Made, spot: Spot, counts: float) -> Change | Refusal:
    """An entry's start so many counts earlier."""
    by = Fraction(counts).limit_denominator(1_000_000)
    handles = {h.role: h for h in time_handles(Found(spot.section, spot.entry, spot.phrase, None))}
    handle = handles.get("at") or handles.get("after")
    if handle is None:
        place = Fraction(float(made.tempo.counts_of(spot.section.at))).limit_denominator(1_000_000) - by
        if place < 0:
            return Refusal("The score would have to start earlier.")
        return (*_end(text, spot.entry.span), f" at {place_text(float(place), made)}")
    old = text_at(text, handle.span)
    if handle.unit == "place":
        place = counts_from_place(handle, made.tempo) - by
        if place < 0:
            return Refusal("The score would have to start earlier.")
        bar = int(np.floor(float(made.tempo.bars(float(place))) + 1e-12))
        count = place - round(float(made.tempo.counts_of_bars(bar))) + 1
        return change_at(text, handle.span, write_place_like(old, bar + 1, count))
    start = float(made.tempo.seconds(made.tempo.counts(spot.from_s) - counts))
    less = Fraction(in_unit(made.tempo, start, spot.from_s, handle.unit)).limit_denominator(1_000_000)
    if handle.value < less:
        return Refusal(
            "The entry would have to start before its section does; move the section, or let the retimer do this hit."
        )
    return change_at(text, handle.span, write_like(old, handle.value - less))


def _end(text: str, span: Span) -> tuple[int, int]:
    """The place behind a span, as one of no width."""
    _, end, _ = change_at(text, span, "")
    return end, end
