"""Laying a take over a score: what the take takes over from falls away, all else in the score stays as it is written, and once
the take is over its fibers come back to where the score has them."""

from collections import defaultdict
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.faults import Fault, Faults
from composer.limits.abilities import Abilities
from composer.motion import strain_at
from composer.quivers import NONE
from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.expand_lines import phrase_lines
from composer.score.expand_starts import Starts, starts_of
from composer.score.expand_times import moments
from composer.score.flat import fiber_in_words
from composer.score.layers import knots_of
from composer.score.model import Entry, Score
from composer.score.tempo import TempoMap, fault_at, with_text
from composer.tracks import Tracks
from player.takes.places import UNIT
from player.takes.played import Array, Index
from player.takes.resuming import Back, between, some_of, tracks_of_starts, ways_back
from player.takes.writing import Written, fibers_text, number_text, place_text

SAME = 1e-9
"""Counts, seconds and strains closer than this are one."""

DIGITS = 12


@dataclass(frozen=True, slots=True)
class Laid:
    """The text of a score with a take laid over it; fell: lines of entries from which it has taken over, or in part; back:
    how many fibers come back to the score once the take is over."""

    text: str
    fell: tuple[int, ...]
    back: int


class Laying:
    """A take of some fibers, from place `begin` (UNITs) on, that is to be laid over a score.

    Whatever these fibers would have begun within the take falls away. An entry of which other fibers, or other repeats, remain
    is written out anew: by their names where that says the same, else each start by itself.
    """

    def __init__(
        self, score: Score, rig: Rig, abilities: Abilities, selector: Selector, tempo: TempoMap, fibers: Index, begin: int
    ):  # fmt: skip
        """Raises Faults where something that is added, and began before, would go on being added to what was played."""
        self.score, self.rig, self.abilities, self.selector, self.tempo = score, rig, abilities, selector, tempo
        self.fibers, self.begin, self.begin_s = fibers, begin, float(tempo.seconds(begin / UNIT))
        faults: list[Fault] = []
        self.starts = starts = starts_of(score, rig, selector, tempo, faults)
        if faults:
            raise Faults(with_text(faults, score))
        self.start_s = tempo.seconds(starts.count)
        self.mine = np.isin(starts.fiber, fibers)
        self.early = starts.count < begin / UNIT - SAME
        self.quivering = self._quivering()

    def set_out(self) -> Array:
        """Strain (F,) from which the take sets out: what the score has as it begins, but for quivers, which fade out there."""
        before = self._tracks(self.early & ~self.quivering)
        return strain_at(replace(before, quivers=NONE), self.abilities, [self.begin_s])[:, 0]

    def lay(self, written: Written, end: int, left: Array, duration_s: float, name: str, about: list[str]) -> Laid:
        """The score with the take in it, up to place `end`, where it leaves the fibers at strains `left` (F,).

        duration_s: of the score; name: of the take's section
        """
        starts, end_s = self.starts, float(self.tempo.seconds(end / UNIT))
        later = ~self.early
        backs = {}
        if end_s < duration_s - SAME:
            base = self._tracks(self.mine & ~starts.added)
            found = ways_back(base, self.abilities, self.fibers, left[self.fibers], end_s, duration_s)
            backs = {back.fiber: back for back in found}
        until = np.full(len(self.rig.fibers), end_s)
        until[list(backs)] = [back.from_s for back in backs.values()]
        falls = (
            self.mine & later & np.where(starts.added, self.start_s < end_s - SAME, self.start_s < until[starts.fiber] - SAME)
        )
        added = (falls & starts.added) | self.quivering
        falls |= self.quivering
        lines, kept, fell = self._without(falls, name)
        words = _Words(self, name)
        if self.quivering.any():
            tracks = self._tracks(self.quivering)
            for fiber in np.unique(starts.fiber[self.quivering]):
                words.add(between(tracks, int(fiber), 0.0, self.begin_s), int(fiber), adds=True)
        for back in backs.values():
            words.way(back, left[back.fiber], end, end_s)
            again = self.start_s[self.mine & ~starts.added & ~falls & (starts.fiber == back.fiber) & later]
            words.add(between(base, back.fiber, back.from_s, float(again.min(initial=np.inf))), back.fiber, adds=False)
        if added.any() and end_s < duration_s - SAME:
            tracks = self._tracks(added)
            quivers = replace(tracks, curve=np.zeros_like(tracks.curve))
            for fiber in np.unique(starts.fiber[added]):
                words.add(between(quivers, int(fiber), until[fiber], np.inf), int(fiber), adds=True)
        text = "\n".join(lines).rstrip("\n") + "\n\n" + "".join(f"# {line}\n" for line in about)
        text += "\n" + written.phrases if written.phrases else ""
        if kept:
            text += (
                f"\n# What the entries above that were taken over play elsewhere.\nsection {name}.beside at 1:1\n"
                + "".join(kept)
            )
        text += f"\nsection {name} at 1:1\n{written.entries}"
        return Laid(text + words.text(), fell, len(backs))

    def _tracks(self, which: NDArray[np.bool_]) -> Tracks:
        return tracks_of_starts(some_of(self.starts, which), self.score, self.rig, self.abilities, self.tempo)

    def _quivering(self) -> NDArray[np.bool_]:
        """Which added starts, begun before, quiver as the take begins; all others add nothing by then. Raises Faults."""
        starts = self.starts
        layers = self.mine & self.early & starts.added
        found = np.zeros(len(layers), dtype=bool)
        if not layers.any():
            return found
        some = some_of(starts, layers)
        faults: list[Fault] = []
        rows = phrase_lines(self.score, some.variants, faults)
        chains = len(self.rig.fibers) + len(some.fiber)
        knots, timed = knots_of(moments(some, rows, self.tempo, self.rig, faults), some, rows, self.abilities, chains)
        whose = np.flatnonzero(layers)
        goes_on = []
        for layer, start in enumerate(whose):
            chain = len(self.rig.fibers) + layer
            mine = slice(knots.first[chain], knots.first[chain + 1])
            ends = np.append(knots.time_s[mine][1:], np.inf)
            if np.abs(knots.curve[mine][ends > self.begin_s + SAME]).max(initial=0.0) > SAME:
                goes_on.append(start)
            found[start] = bool(np.any(timed.until_s[timed.chain == chain] > self.begin_s + SAME))
        for entry in np.unique(starts.entry[goes_on]):
            faults.append(
                fault_at(
                    starts.entries[entry].span,
                    "this entry adds to fibers that the take has played, and would go on doing so",
                    "no 'add' of these fibers that begins before the take and stays above rest",
                    "take its fibers out of the entry, or punch in before it begins",
                )
            )
        if faults:
            raise Faults(with_text(faults, self.score))
        return found

    def _without(self, falls: NDArray[np.bool_], name: str) -> tuple[list[str], list[str], tuple[int, ...]]:
        """The score's lines without some starts, entries for those of them that no line says any more, and lines concerned."""
        score, starts = self.score, self.starts
        lines = list(score.lines[score.file])
        kept: list[str] = []
        fell = []
        for number in np.unique(starts.entry[falls]):
            entry = starts.entries[number]
            all_of = np.flatnonzero(starts.entry == number)
            left = all_of[~falls[all_of]]
            at = entry.span.line - 1
            was = lines[at]
            fell.append(entry.span.line)
            lines[at] = f"  # taken over by {name}: {was.strip()}"
            if len(left) and _by_name(entry, starts, all_of, left):
                names = fibers_text(np.unique(starts.fiber[left]), self.rig, self.selector)
                first, last = entry.fibers[0].span.column - 1, entry.fibers[-1].span.end - 1
                lines[at] = f"{was[:first]}{names}{was[last:]}"
            elif len(left):
                kept += _one_by_one(entry, starts, left, self.rig, self.selector, self.tempo)
        return lines, kept, tuple(fell)


class _Words:
    """What the score has fibers do outside of the take, and no line of its own says any more: phrases and entries."""

    def __init__(self, laying: Laying, name: str):
        self._laying, self._name = laying, name
        self._parts: dict[tuple[str, bool, tuple[str, ...]], list[int]] = defaultdict(list)

    def way(self, back: Back, left: float, end: int, end_s: float) -> None:
        """The way of a fiber back to the score, from where the take leaves it."""
        if abs(back.there - left) <= SAME:
            return
        at = place_text(end, self._laying.tempo) if back.leaves_s - end_s <= SAME else f"{_number(back.leaves_s)}s"
        line = f"  {_number(back.from_s - back.leaves_s)}s  {_number(100.0 * max(back.there, 0.0))}%"
        self._parts[at, False, (line,)].append(back.fiber)

    def add(self, tracks: Tracks, fiber: int, *, adds: bool) -> None:
        """What a track has a fiber do, unless it only stands."""
        for _, start_s, more, lines in fiber_in_words(tracks, fiber, self._laying.rig):
            if not all(line.endswith(" hold") for line in lines):
                self._parts[f"{_number(start_s)}s", adds or more, tuple(lines)].append(fiber)

    def text(self) -> str:
        """All of it, fibers that do the same in one entry."""
        if not self._parts:
            return ""
        laying, phrases, entries = self._laying, "", ""
        used = set(laying.score.phrases)
        for (at, adds, lines), fibers in self._parts.items():
            stem = f"{self._name}.score"
            number = 1
            while f"{stem}.{number}" in used:
                number += 1
            used.add(f"{stem}.{number}")
            phrases += f"\nphrase {stem}.{number}\n" + "".join(f"{line}\n" for line in lines)
            names = fibers_text(np.array(sorted(fibers)), laying.rig, laying.selector)
            entries += f"  {names}  {stem}.{number}  at {at}{'  add' if adds else ''}\n"
        return f"\n# As the score has it, outside of the take.{phrases}\nsection {self._name}.score at 1:1\n{entries}"


def _number(value: float) -> str:
    return f"{value:.{DIGITS}f}".rstrip("0").rstrip(".")


def _by_name(entry: Entry, starts: Starts, all_of: Index, left: Index) -> bool:
    """Whether the entry says the same of the fibers that are left once the others are not named any more."""
    ordered = entry.canon or entry.ripple or entry.mirror
    return not ordered and np.count_nonzero(np.isin(starts.fiber[all_of], starts.fiber[left])) == len(left)


def _one_by_one(entry: Entry, starts: Starts, left: Index, rig: Rig, selector: Selector, tempo: TempoMap) -> list[str]:
    """The starts that are left, those at one instant on one line."""
    options = ""
    for word, value in (("scale", entry.scale), ("stretch", entry.stretch), ("firm", entry.firm)):
        options += f"  {word} {number_text(value)}" if value != 1 else ""
    options += "  retrograde" if entry.retrograde else ""
    options += "  add" if entry.add else ""
    together: dict[int, list[int]] = defaultdict(list)
    for start in left:
        together[round(float(starts.count[start]) * UNIT)].append(int(starts.fiber[start]))
    lines = []
    for place, fibers in sorted(together.items()):
        who = fibers_text(np.array(sorted(fibers)), rig, selector)
        lines.append(f"  {who}  {entry.phrase.text}  at {place_text(place, tempo)}{options}\n")
    return lines
