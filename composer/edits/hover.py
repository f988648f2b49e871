"""What a word of a text means here, in this score and on this rig."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from lark import Token

from composer.edits.abilities import limits_of
from composer.edits.colouring import LONGEST, blocks_until, tokens_of
from composer.edits.language import UNITS, word_at
from composer.edits.made import Made
from composer.faults import Faults
from composer.report.sentences import named
from composer.rig.select import Selector, UnknownName
from composer.score.expand_lines import TARGET_UNITS as IN_TRACKS
from composer.score.expand_lines import phrase_length
from composer.score.expand_ways import in_strain
from composer.score.grammar import body_of
from composer.score.model import Duration, Entry, Phrase, Place, Section
from composer.score.names import groups_of
from composer.score.numbers import Unreadable, written
from composer.score.row import Row
from composer.score.words import TARGET_UNITS
from composer.score.words import UNITS as DURATION_UNITS

MOST_PLAYERS = 6
"""Lines that play a phrase and are named before the rest are only counted."""


@dataclass(frozen=True, slots=True)
class Hover:
    """An explanation: columns, from 1, `start` to before `end` of the word, a title and lines below it."""

    start: int
    end: int
    title: str
    lines: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class _Here:
    """A word where it stands: token, which of its line's tokens it is, the line's number, text and block, and what is known."""

    token: Token
    number: int
    before: tuple[Token, ...]
    block: str
    line: int
    row: str
    made: Made | None


_Told = tuple[str, tuple[str, ...]] | None


def explain(text: str, line: int, column: int, made: Made | None = None) -> Hover | None:
    """What stands at a place (line and column from 1) means here; None where there is nothing to say.

    `made` is the last state that could be read; without one only the language itself is explained.
    """
    lines = text.split("\n")
    if not 0 < line <= len(lines) or len(lines[line - 1]) > LONGEST:
        return None
    row = lines[line - 1].removesuffix("\r").replace("\ufeff", " ")
    body, block = body_of(row), blocks_until(lines, line)
    if not body.strip() or not block:
        return None
    tokens, _ = tokens_of(block, body)
    for number, token in enumerate(tokens):
        if token.start_pos < column <= token.start_pos + len(token) + 1:
            after = tokens[number + 1] if number + 1 < len(tokens) else None
            if column == token.start_pos + len(token) + 1 and after is not None and after.start_pos < column:
                continue  # between two, the caret is at the second
            here = _Here(token, number, tokens[:number], block, line, row, made)
            told = _TELLERS.get(token.type, _word)(here)
            return told and Hover(token.start_pos + 1, token.start_pos + 1 + len(token), *told)
    return None


def _word(here: _Here) -> _Told:
    """A word of the language."""
    word = word_at(str(here.token), here.block, here.number == 0)
    return word and (word.form, (word.says[:1].upper() + word.says[1:] + ".",))


def _fibers(here: _Here) -> _Told:
    """A fiber, group, range or wildcard: who it is, and what it can do."""
    made, name = here.made, str(here.token)
    if made is None:
        return None
    try:
        fibers = Selector(made.rig, groups_of(made.score)).resolve(name)
    except UnknownName as unknown:
        return name, (f"No fiber or group of this name in {made.rig.file}.", *([unknown.hint] if unknown.hint else []))
    names = [made.rig.fibers[f].name for f in fibers]
    who = () if names == [name] else (f"{len(names)} fiber{'' if len(names) == 1 else 's'}: {named(names)}",)
    return name, (*who, *limits_of(fibers, made.rig, made.abilities))


def _name(here: _Here) -> _Told:
    """A group's or a section's own name."""
    opens = here.before[0].type if here.before else ""
    if opens == "GROUP":
        return _fibers(here)
    section = None if here.made is None else next((s for s in here.made.score.sections if s.span.line == here.line), None)
    if section is None:
        return None
    count = len(section.entries)
    return f"section {section.name}", (f"{count} {'entry' if count == 1 else 'entries'}.", *_where(section.at, here.made))


def _phrase(here: _Here) -> _Told:
    """A phrase: how long, how far, who plays it."""
    made, name = here.made, str(here.token)
    if made is None or name not in made.score.phrases:
        return None if made is None else (name, ("No phrase of this name has been written.",))
    phrase = made.score.phrases[name]
    lines = [_length(phrase, made)]
    highest = [one for one in phrase.lines if one.target.unit != "hold"]
    if highest:
        units = sorted({one.target.unit for one in highest})
        tops = [max((one for one in highest if one.target.unit == unit), key=lambda one: one.target.value) for unit in units]
        lines.append("Highest: " + ", ".join(_amount(one.target.value, one.target.unit) for one in tops) + ".")
    players = [e for s in made.score.sections for e in s.entries if e.phrase.text == name]
    if players:
        selector = Selector(made.rig, groups_of(made.score))
        fibers: set[int] = set()
        for one in players:
            try:
                fibers |= {f for n in one.fibers for f in selector.resolve(n.text)}
            except UnknownName:
                continue
        at = ", ".join(str(one.span.line) for one in players[:MOST_PLAYERS])
        more = f" and {len(players) - MOST_PLAYERS} more" if len(players) > MOST_PLAYERS else ""
        lines.append(f"Played by {len(fibers)} fibers, in {'line' if len(players) == 1 else 'lines'} {at}{more}.")
    else:
        lines.append("Nobody plays it yet.")
    return f"phrase {name}", tuple(lines)


def _length(phrase: Phrase, made: Made) -> str:
    length = phrase_length(phrase)
    if length is None:
        return "It has no lines: who plays it holds."
    said = f"{float(length.value):g} {length.unit}"
    seconds = sorted({round(value, 4) for value in _seconds_of(length, phrase, made)})
    if not seconds:
        return f"{said} long."
    span = f"{seconds[0]:.2f} s" if seconds[-1] - seconds[0] < 0.005 else f"{seconds[0]:.2f} to {seconds[-1]:.2f} s"
    return f"{said} long; {span} where it is played."


def _amount(value, unit: str) -> str:
    return f"{float(value):g} of the stroke" if unit == "stroke" else f"{float(value):g} {unit}" if unit != "%" else (
        f"{float(value):g} % strain"
    )  # fmt: skip


def _starts(phrase: Phrase | None, entry: Entry | None, made: Made) -> list[tuple[float, float]]:
    """Starts in counts, and stretches, of those who play a phrase, or of one entry; the first of each entry."""
    found: list[tuple[float, float]] = []
    for section in made.score.sections:
        for one in section.entries:
            if one is entry or (entry is None and phrase is not None and one.phrase.text == phrase.name):
                found.append((_start(section, one, made), float(one.stretch)))
    return found


def _start(section: Section, entry: Entry | None, made: Made) -> float:
    tempo = made.tempo
    if entry is not None and entry.at is not None:
        return tempo.counts_of(entry.at)
    start = tempo.counts_of(section.at)
    if entry is not None and entry.after is not None:
        start = float(tempo.shifted(start, float(entry.after.value), entry.after.unit))
    return start


def _seconds_of(length: Duration, phrase: Phrase, made: Made) -> list[float]:
    """How long a phrase lasts wherever it is played."""
    tempo = made.tempo
    return [
        float(tempo.seconds(tempo.shifted(start, float(length.value) * stretch, length.unit)) - tempo.seconds(start))
        for start, stretch in _starts(phrase, None, made)
    ]


def _where(place: Place, made: Made | None) -> tuple[str, ...]:
    """A place in seconds, bars and counts."""
    if made is None:
        return ()
    try:
        seconds = float(made.tempo.seconds(made.tempo.counts_of(place)))
    except Faults as wrong:
        return (wrong.faults[0].found + ".",)
    counts = float(made.tempo.counts(seconds))
    rate = 60.0 / max(1e-9, float(made.tempo.seconds(counts + 1e-3) - made.tempo.seconds(counts)) / 1e-3)
    return (
        f"{seconds:.3f} s from the start, bar {_bar_count(made, seconds)}.",
        f"The tempo there: {rate:.1f} counts a minute.",
    )


def _bar_count(made: Made, seconds: float) -> str:
    bar, _, count = made.tempo.say_place(seconds).partition(":")
    return f"{bar} count {count}"


def _place(here: _Here) -> _Told:
    faults: list = []
    place = Row("", here.line, here.row, faults).place(here.token)
    if faults:
        return str(here.token), (faults[0].found + ".",)
    where = _where(place, here.made)
    if here.made is None:
        return None
    cues = [cue.name for cue in here.made.score.cues if (cue.at.bar, cue.at.count, cue.at.seconds) == (
        place.bar, place.count, place.seconds)]  # fmt: skip
    return str(here.token), (*where, *(f'Cue "{name}".' for name in cues))


def _duration(here: _Here) -> _Told:
    """A duration: how many seconds it is here, wherever here is."""
    made, text = here.made, str(here.token)
    try:
        number = written(text)
    except Unreadable as wrong:
        return text, (f"{wrong}.",)
    unit, scale = DURATION_UNITS[number.unit.strip()]
    value = float(number.value / scale)
    title = f"{text}: {value:g} {unit if value != 1.0 else unit.removesuffix('s') or unit}"
    if made is None:
        return title, ()
    spans = sorted({round(one, 6) for one in _lasts(here, value, unit, made)})
    if not spans:
        return title, ()
    if spans[-1] - spans[0] < 5e-4:
        return title, (f"{spans[0]:.3f} s here.",)
    return title, (f"{spans[0]:.3f} to {spans[-1]:.3f} s, by where it is played.",)


def _lasts(here: _Here, value: float, unit: str, made: Made) -> list[float]:
    """Seconds that a duration lasts in each place where its line counts."""
    tempo, score = made.tempo, made.score
    starts: list[tuple[float, float]] = []
    back = 0.0
    for phrase in score.phrases.values():
        if phrase.span.file != score.file:
            continue
        for line in phrase.lines:
            if line.span.line == here.line:
                starts = _starts(phrase, None, made)
                # How long a move takes counts from the line back.
                back = float(line.offset.value) if here.number and line.offset.unit == "counts" else 0.0
        if phrase.span.line == here.line:
            starts = _starts(phrase, None, made)
    for section in score.sections:
        if section.span.line == here.line:
            starts = [(_start(section, None, made), 1.0)]
        for entry in section.entries:
            if entry.span.line == here.line:
                after = here.before and str(here.before[-1]) == "after"
                starts = [(_start(section, None if after else entry, made), 1.0)]
    for pin in score.pins:
        if pin.span.line == here.line:
            starts = [(tempo.counts_of(pin.at), 1.0)]
    found = []
    for start, stretch in starts:
        end = start + back * stretch
        begin = end if not back else float(tempo.shifted(end, -value * stretch, unit))
        until = end if back else float(tempo.shifted(end, value * stretch, unit))
        found.append(float(tempo.seconds(until) - tempo.seconds(begin)))
    return found


def _target(here: _Here) -> _Told:
    """A target: strain and way for those who play its phrase."""
    made, text = here.made, str(here.token)
    if here.token.type in ("REST", "FULL", "HOLD"):
        return _word(here)
    try:
        number = written(text)
    except Unreadable as wrong:
        return text, (f"{wrong}.",)
    unit = TARGET_UNITS[number.unit.strip()]
    title = f"{text}: {_amount(number.value, unit)}"
    if made is None:
        return title, (UNITS.get(number.unit.strip(), ""),) if number.unit.strip() in UNITS else ()
    return title, tuple(_for_fibers(here, float(number.value), unit, made))


def _for_fibers(here: _Here, value: float, unit: str, made: Made) -> list[str]:
    """What a target is in strain, share and millimetres, for each kind of fiber that plays it."""
    name = next((p.name for p in made.score.phrases.values() if any(
        one.span.line == here.line and one.span.file == made.score.file for one in p.lines)), None)  # fmt: skip
    selector, alike = Selector(made.rig, groups_of(made.score)), {}
    for section in made.score.sections:
        for entry in section.entries:
            if entry.phrase.text == name:
                for one in entry.fibers:
                    try:
                        for f in selector.resolve(one.text):
                            alike.setdefault(int(made.abilities.which[f]), []).append(f)
                    except UnknownName:
                        continue
    told, too_much = [], 0
    for fibers in list(alike.values())[:MOST_PLAYERS]:
        f = np.array([fibers[0]])
        strain = float(in_strain(np.array([value]), np.array([IN_TRACKS.index(unit)]), f, made.abilities)[0])
        stroke = float(made.abilities.stroke[f[0]])
        if not np.isfinite(strain):
            continue
        who = named([made.rig.fibers[n].name for n in sorted(set(fibers))])
        over = "; more than it can" if strain > stroke * (1 + 1e-9) else ""
        too_much += bool(over) and unit == "%"
        told.append(
            f"{who}: {100 * strain:.1f} % strain, {strain * float(made.abilities.length_mm[f[0]]):.0f} mm, "
            f"{strain / stroke:.2f} of the stroke{over}."
        )
    if too_much and value <= 100.0:
        told.append(f"% is strain, a change of length; {value:g} % of the stroke is written {value / 100.0:g}.")
    return told


def _text(here: _Here) -> _Told:
    made = here.made
    if made is None or not here.before or here.before[0].type != "CUE":
        return None
    cue = next((cue for cue in made.score.cues if cue.span.line == here.line), None)
    return cue and (f'cue "{cue.name}"', _where(cue.at, made))


def _hertz(here: _Here) -> _Told:
    try:
        value = float(written(str(here.token)).value)
    except Unreadable as wrong:
        return str(here.token), (f"{wrong}.",)
    return str(here.token), (f"A swing in {1000.0 / value:.0f} ms.",) if value > 0 else ()


_TELLERS: dict[str, Callable[[_Here], _Told]] = {
    "SELECTION": _fibers, "NAME": _name, "PHRASE_NAME": _phrase, "PLACE": _place, "DURATION": _duration, "TARGET": _target,
    "REST": _target, "FULL": _target, "HOLD": _target, "STRING": _text, "HERTZ": _hertz,
    **dict.fromkeys(("NUMBER", "INTEGER", "SPEED", "SIGNATURE", "PATH", "_COMMA", "_EQUALS"), lambda here: None),
}  # fmt: skip
