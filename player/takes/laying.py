"""Laying a take over a score: what the take takes over from falls away, all else in the score stays as it is written."""

from collections import defaultdict
from dataclasses import dataclass

import numpy as np

from composer.faults import Fault, Faults
from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.expand_starts import Starts, starts_of
from composer.score.model import Entry, Score
from composer.score.tempo import TempoMap, fault_at, with_text
from player.takes.places import UNIT
from player.takes.played import Index
from player.takes.writing import Written, fibers_text, number_text, place_text

SAME = 1e-9
"""Counts closer than this are one."""


@dataclass(frozen=True, slots=True)
class Laid:
    """The text of a score with a take laid over it; fell: lines of entries from which it has taken over, or in part."""

    text: str
    fell: tuple[int, ...]


def lay_over(
    score: Score, rig: Rig, selector: Selector, tempo: TempoMap, written: Written, fibers: Index, begin: int, end: int,
    name: str, about: list[str],
) -> Laid:  # fmt: skip
    """Lay a take of some fibers over a score, from place `begin` to `end` (UNITs).

    Whatever these fibers would have begun within that stretch falls away. An entry of which other fibers, or other repeats,
    remain is written out anew: by their names where that says the same, else each start by itself.

    Raises Faults where an `add` entry that began before goes on over the take: it would be added to what was played.
    """
    faults: list[Fault] = []
    starts = starts_of(score, rig, selector, tempo, faults)
    mine = np.isin(starts.fiber, fibers)
    early = np.flatnonzero(mine & starts.added & (starts.count < begin / UNIT - SAME))
    for entry in np.unique(starts.entry[early]):
        span = starts.entries[entry].span
        faults.append(
            fault_at(
                span,
                "this entry adds to fibers that the take has played, and would go on doing so",
                "no 'add' of these fibers that begins before the take",
                "take its fibers out of the entry, or punch in before it begins",
            )
        )
    if faults:
        raise Faults(with_text(faults, score))
    falls = mine & (starts.count >= begin / UNIT - SAME) & (starts.count < end / UNIT - SAME)
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
            names = fibers_text(np.unique(starts.fiber[left]), rig, selector)
            first, last = entry.fibers[0].span.column - 1, entry.fibers[-1].span.end - 1
            lines[at] = f"{was[:first]}{names}{was[last:]}"
        elif len(left):
            kept += _one_by_one(entry, starts, left, rig, selector, tempo)
    text = "\n".join(lines).rstrip("\n") + "\n\n" + "".join(f"# {line}\n" for line in about)
    text += "\n" + written.phrases if written.phrases else ""
    if kept:
        text += f"\n# What the entries above that were taken over play elsewhere.\nsection {name}.beside at 1:1\n" + "".join(
            kept
        )
    return Laid(f"{text}\nsection {name} at 1:1\n{written.entries}", tuple(fell))


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
