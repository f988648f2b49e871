"""A score's text rewritten such that its instances are where they are wanted: numbers first, copies of phrases where others
play them as they are, plain entries where no number of an entry says it."""

from collections import Counter
from dataclasses import dataclass, field
from fractions import Fraction

import numpy as np

from composer.edits.copying import copied, inserted, new_name
from composer.edits.edit import Change, change_at, line_starts
from composer.edits.instances import Instances
from composer.edits.made import Made
from composer.edits.plain import plain_entry, played_backwards
from composer.edits.saying import SAME_S, Saying, Word, in_unit, number, phrase_words, saying
from composer.edits.selection import selection
from composer.edits.values import counts_from_place
from composer.edits.wanted import Wanted
from composer.score.flat import fiber_in_words
from composer.score.model import Duration, Entry, Phrase, Section
from composer.score.numbers import write_place_like
from composer.score.spans import Found, span_of, text_at, time_handles
from composer.tracks import Tracks


@dataclass(slots=True)
class Plan:
    """What is to be written: which entries become plain ones, and which fibers are written out move by move."""

    plain: set[int] = field(default_factory=set)
    flat: set[int] = field(default_factory=set)


@dataclass(frozen=True, slots=True)
class _User:
    """Who plays a phrase with the same words changed: an entry that stays (`fibers` empty), or some fibers from a count on."""

    entry: int
    words: tuple[Word, ...]
    fibers: tuple[int, ...] = ()
    start_count: float = 0.0
    own: tuple[str, ...] = ()


class Rewriting:
    """One rewriting of one text."""

    def __init__(self, text: str, made: Made, all_: Instances, new: Wanted, tracks: Tracks, plan: Plan):
        self.text, self.made, self.all, self.new, self.tracks, self.plan = text, made, all_, new, tracks, plan
        self.score, self.tempo = made.score, made.tempo
        self.lines_of = all_.lines_of
        self.sections = {id(entry): section for section in self.score.sections for entry in section.entries}
        self.changes: list[Change] = []
        self.notes: list[str] = []
        self.taken: set[str] = set()
        self.ending = "\r\n" if "\r\n" in text else "\n"

    def changes_and_notes(self) -> tuple[list[Change], tuple[str, ...]]:
        """All changes of the text, and a sentence for what no number could say."""
        users: list[_User] = []
        by_entry = np.argsort(self.all.entry, kind="stable")
        edges = np.searchsorted(self.all.entry[by_entry], np.arange(len(self.all.entries) + 1))
        for n in range(len(self.all.entries)):
            mine = by_entry[edges[n] : edges[n + 1]].tolist()
            users += self._entry(n, mine)
        names = self._phrases(users)
        for user, name in zip(users, names, strict=True):
            if not user.fibers:
                self._stays(user, name)
        self._plain([(user, name) for user, name in zip(users, names, strict=True) if user.fibers])
        self._flat()
        return self.changes, tuple(self.notes)

    def _entry(self, n: int, mine: list[int]) -> list[_User]:
        """The users that an entry becomes: itself where one set of numbers says it, else groups of fibers."""
        said = [self._said(which) for which in mine]
        shifts = [
            0.0 if one is None else one.start_count - float(self.all.start_count[which])
            for one, which in zip(said, mine, strict=True)
        ]
        flat = any(int(self.all.fiber[which]) in self.plan.flat for which in mine)
        alike = not flat and all(one is not None and one.words == said[0].words for one in said)
        if n not in self.plan.plain and alike and (not mine or max(shifts) - min(shifts) < 1e-9):
            return [_User(n, said[0].words if said else (), (), shifts[0] if shifts else 0.0)]
        groups: dict[tuple, list[int]] = {}
        for one, which in zip(said, mine, strict=True):
            if int(self.all.fiber[which]) in self.plan.flat:
                continue
            backwards = bool(self.all.backwards[which])
            own = played_backwards(self.made, self.all, self.new, which, range(*self.lines_of[which : which + 2])) if (
                one is None or backwards) else ()  # fmt: skip
            words = () if one is None else one.words
            count = float(self.tempo.counts(self.new.start_s[which])) if one is None else one.start_count
            key = (() if own else words, own, round(count, 9), self._repeat(n, which, mine))
            groups.setdefault(key, []).append(int(self.all.fiber[which]))
        self._note(n)
        return [_User(n, words, tuple(fibers), count, own) for (words, own, count, _), fibers in groups.items()] or [
            _User(n, (), (-1,), 0.0)
        ]

    def _repeat(self, n: int, which: int, mine: list[int]) -> int:
        """One fiber may start twice alike only in two entries."""
        fiber = self.all.fiber[which]
        return sum(1 for other in mine if other < which and self.all.fiber[other] == fiber
                   and abs(self.new.start_s[other] - self.new.start_s[which]) < SAME_S)  # fmt: skip

    def _said(self, which: int) -> Saying | None:
        rows = range(*self.lines_of[which : which + 2])
        if self.new.bent[which]:
            return None
        if self.all.backwards[which]:
            shift = float(self.new.start_s[which] - self.all.start_s[which])
            moved = np.abs(self.new.until_s[rows] - self.all.until_s[rows] - shift) if len(rows) else np.zeros(1)
            early = np.abs(self.new.leaves_s[rows] - self.all.leaves_s[rows] - shift) * self.all.goes[rows]
            if max(moved.max(), early.max(initial=0.0)) > SAME_S:
                return None
            same = abs(shift) <= SAME_S
            return Saying((), float(self.all.start_count[which] if same else self.tempo.counts(self.new.start_s[which])))
        return saying(self.all, self.new, which, rows, self.tempo, self._text_of)

    def _text_of(self, duration: Duration) -> str:
        span = duration.span
        return self.score.lines[span.file][span.line - 1][span.column - 1 : span.end - 1]

    def _note(self, n: int) -> None:
        entry = self.all.entries[n]
        what = [name for name in ("canon", "ripple", "scatter", "times", "mirror") if span_of(entry, name)]
        says = f" with '{what[0]}'" if what else ""
        self.notes.append(
            f"Line {entry.span.line}: its fibers no longer move alike, so the entry{says} is now several plain ones."
        )

    def _phrases(self, users: list[_User]) -> list[str]:
        """The phrase that each user plays: the original, rewritten in place where all want the same, or a copy."""
        by_phrase: dict[str, Counter] = {}
        for user in users:
            if not user.own and user.fibers != (-1,):
                by_phrase.setdefault(self._phrase(user).name, Counter())[user.words] += 1
        names: dict[tuple, str] = {}
        for name, wants in by_phrase.items():
            phrase = self.score.phrases[name]
            if () in wants or phrase.span.file != self.score.file:
                original = ()
            else:
                original = wants.most_common(1)[0][0]
                spans, added = phrase_words(phrase, original)
                self.changes += [change_at(self.text, span, text) for span, text in spans]
                for at, text in added.items():
                    end = phrase.lines[at].span
                    self.changes.append(change_at(self.text, type(end)(end.file, end.line, end.end, end.end), f" over {text}"))
            names[name, original] = name
        found: list[str] = []
        for user in users:
            phrase = self._phrase(user)
            if user.fibers == (-1,):  # nobody is left to play it
                found.append(phrase.name)
                continue
            key = (phrase.name, user.own or user.words)
            if key not in names:
                section = self.sections[id(self.all.entries[user.entry])]
                copy = new_name(self.score, phrase.name, section.name, self.taken)
                self.taken.add(copy)
                names[key] = copy
                self.changes.append(self._copy(phrase, copy, user, section))
            found.append(names[key])
        return found

    def _phrase(self, user: _User) -> Phrase:
        return self.score.phrases[self.all.entries[user.entry].phrase.text]

    def _copy(self, phrase: Phrase, name: str, user: _User, section: Section) -> Change:
        if user.own:
            return inserted(self.text, self.score, phrase, "\n".join([f"phrase {name}", *user.own]), section)
        spans, added = phrase_words(phrase, user.words)
        for at, text in added.items():
            end = phrase.lines[at].span
            spans.append((type(end)(end.file, end.line, end.end, end.end), f" over {text}"))
        return inserted(self.text, self.score, phrase, copied(self.score, phrase, name, spans), section)

    def _stays(self, user: _User, name: str) -> None:
        """An entry that stays: its phrase's name, and its start where that has moved."""
        entry = self.all.entries[user.entry]
        if name != entry.phrase.text:
            self.changes.append(change_at(self.text, entry.phrase.span, name))
        shift = user.start_count
        if abs(shift) < 1e-9:
            return
        section = self.sections[id(entry)]
        handles = {handle.role: handle for handle in time_handles(Found(section, entry, None, None))}
        if "at" in handles or "after" in handles:
            handle = handles.get("at") or handles["after"]
            old = text_at(self.text, handle.span)
            which = int(np.flatnonzero(self.all.entry == user.entry)[0])
            begins, moved = float(self.all.start_s[which]), float(self.new.start_s[which])
            if handle.unit == "place":
                self.changes.append(
                    change_at(self.text, handle.span, self._place(counts_from_place(handle, self.tempo), shift))
                )
            else:
                value = float(handle.value) + in_unit(self.tempo, begins, moved, handle.unit)
                self.changes.append(change_at(self.text, handle.span, number(old, value, handle.unit)))
            return
        end = entry.span
        where = f" after {number('', shift, 'counts')}"
        if shift < 0.0:
            begins = float(self.tempo.counts_of(section.at))
            where = f" at {self._place(Fraction(begins), shift)}"
        self.changes.append(change_at(self.text, type(end)(end.file, end.line, end.end, end.end), where))

    def _place(self, counts: Fraction, shift: float) -> str:
        return place_text(float(counts) + shift, self.made)

    def _plain(self, users: list[tuple[_User, str]]) -> None:
        """Plain entries in place of those that could not stay; of a section that is repeated, in a section of their own."""
        lines: dict[int, list[str]] = {}
        for user, name in sorted(users, key=lambda one: (one[0].entry, one[0].start_count)):
            entry = self.all.entries[user.entry]
            written = lines.setdefault(user.entry, [])
            if user.fibers != (-1,):
                place = self._start_text(user, entry)
                fibers = selection(user.fibers, self.score, self.made.rig)
                written.append(plain_entry(self.score, entry, fibers, name, place, bool(user.own)))
        for n, written in lines.items():
            entry = self.all.entries[n]
            section = self.sections[id(entry)]
            row = self.score.lines[self.score.file][entry.span.line - 1]
            comment = row[entry.span.end - 1 :].strip()
            span = type(entry.span)(entry.span.file, entry.span.line, 1, len(row) + 1)
            aside = f"  {comment}" if comment else ""
            if not written:
                self.changes.append(change_at(self.text, span, f"  # nobody is left here: {row.strip()}"))
            elif section.repeat is None:
                written[0] += aside
                self.changes.append(change_at(self.text, span, self.ending.join(written)))
            else:
                self.changes.append(change_at(self.text, span, f"  # written out below: {row.strip()}"))
                self._own_section(section, written)

    def _start_text(self, user: _User, entry: Entry) -> str:
        """Where a plain entry starts: in the words that are there if that is where it did, else a place."""
        section = self.sections[id(entry)]
        if section.repeat is None:
            begins = float(self.tempo.counts_of(section.at))
            if entry.at is not None:
                begins = float(self.tempo.counts_of(entry.at))
            elif entry.after is not None:
                begins = float(self.tempo.shifted(begins, float(entry.after.value), entry.after.unit))
            if abs(begins - user.start_count) < 1e-9:
                written = entry.at or entry.after
                word = "at" if entry.at is not None else "after"
                return "" if written is None else f"  {word} {text_at(self.text, written.span)}"
        return f"  at {place_text(user.start_count, self.made)}"

    def _own_section(self, section: Section, written: list[str]) -> None:
        """A section of its own for entries that are not repeated, behind the one that they were in."""
        last = max(section.span.line, *(entry.span.line for entry in section.entries))
        known = {one.name for one in self.score.sections} | self.taken
        name = next(f"{section.name}-{k}" for k in range(2, len(known) + 3) if f"{section.name}-{k}" not in known)
        self.taken.add(name)
        head = f"section {name} at {place_text(float(self.tempo.counts_of(section.at)), self.made)}"
        head += f" keep {section.keep}" if section.keep else ""
        head += f" firm {float(section.firm):g}" if section.firm != 1 else ""
        self._behind(last, [head, *written])

    def _behind(self, line: int, block: list[str]) -> None:
        starts = line_starts(self.text)
        joined = self.ending.join(block)
        if line < len(starts):
            self.changes.append((starts[line], starts[line], f"{self.ending}{joined}{self.ending}"))
        else:
            self.changes.append((len(self.text), len(self.text), f"{self.ending}{self.ending}{joined}"))

    def _flat(self) -> None:
        """Fibers that are written out move by move, in a section at the end."""
        if not self.plan.flat:
            return
        block, entries = [], []
        for fiber in sorted(self.plan.flat):
            for name, start_s, adds, lines in fiber_in_words(self.tracks, fiber, self.made.rig):
                own = new_name(self.score, name, "retimed", self.taken) if name in self.score.phrases else name
                self.taken.add(own)
                block += [f"phrase {own}", *lines, ""]
                at = f"{start_s:.12f}".rstrip("0").rstrip(".")
                entries.append(f"  {self.made.rig.fibers[fiber].name}  {own}  at {at}s" + ("  add" if adds else ""))
        names = {one.name for one in self.score.sections} | self.taken
        name = next(n for n in ("retimed", *(f"retimed-{k}" for k in range(2, len(names) + 3))) if n not in names)
        if entries:
            self._behind(len(self.score.lines[self.score.file]), [*block, f"section {name} at 0s", *entries, ""])
        who = selection(self.plan.flat, self.score, self.made.rig)
        self.notes.append(f"{who}: entries lie over one another there, so every move is written out, in section '{name}'.")


def place_text(count: float, made: Made) -> str:
    """A place, bar and count, of counts from the score's start."""
    nice = Fraction(count).limit_denominator(96)
    counts = nice if abs(float(nice) - count) < 1e-9 else Fraction(count)
    bar = int(np.floor(float(made.tempo.bars(float(counts))) + 1e-12))
    within = counts - Fraction(round(float(made.tempo.counts_of_bars(bar)))) + 1
    if counts is nice:
        return write_place_like("1:1", bar + 1, within)
    return f"{bar + 1}:{number('', float(within), 'counts')}"
