"""Every phrase that every fiber plays, line by line with its instants: what a number of the text moves."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.faults import Fault
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.expand_lines import phrase_lines
from composer.score.expand_starts import Starts, starts_of
from composer.score.expand_times import moments
from composer.score.expand_ways import goes_nowhere, ways_of
from composer.score.model import Entry, Line, Phrase, Score
from composer.score.names import groups_of
from composer.score.tempo import TempoMap

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Instances:
    """N instances (one fiber playing one phrase once), by fiber and start, and their M lines in order. A line that a later
    entry takes over before it has begun is left out.

    fiber, entry, backwards, added: (N,) index in the rig; index into `entries`; played retrograde; a layer of its own
    start_s, start_count, cut_s, end_s: (N,) where it starts, where another takes over (inf: nowhere), where its phrase ends
    stretch, scale: (N,)
    instance, place: (M,) index into the instances; which of the instance's lines this is, as played, from 0
    line: (M,) line of the score, 0 in another file; written: by `row` (M,), the line as read
    before_s, leaves_s, stops_s, arrives_s, until_s: (M,) the line before; the move's begin, its end or cut, its end, the line
    a, b: (M,) strain where the move begins and ends (at its cut); goes: (M,) whether it goes anywhere
    """

    fiber: Index
    entry: Index
    backwards: Flags
    added: Flags
    start_s: Array
    start_count: Array
    cut_s: Array
    end_s: Array
    stretch: Array
    scale: Array
    entries: tuple[Entry, ...]
    phrases: tuple[Phrase, ...]
    variant: Index
    instance: Index
    place: Index
    row: Index
    line: NDArray[np.int32]
    written: tuple[Line, ...]
    before_s: Array
    leaves_s: Array
    stops_s: Array
    arrives_s: Array
    until_s: Array
    a: Array
    b: Array
    goes: Flags

    @property
    def lines_of(self) -> Index:
        """(N + 1,) where each instance's lines begin."""
        return np.searchsorted(self.instance, np.arange(len(self.fiber) + 1))

    @property
    def entry_line(self) -> NDArray[np.int32]:
        """(N,) the line of the score of each instance's entry."""
        known = np.array([entry.span.line for entry in self.entries], dtype=np.int32)
        return known[self.entry] if len(known) else np.empty(0, dtype=np.int32)


def instances_of(
    score: Score, rig: Rig, abilities: Abilities, tempo: TempoMap, fibers: Flags | None = None
) -> tuple[Instances, list[Fault]]:
    """The instances of a score, of some of its fibers (F,) where they are given; and the faults of expansion, if any.

    The score's names have been checked (`check_names`). With faults the instances are those that could be made out.
    """
    faults: list[Fault] = []
    starts = starts_of(score, rig, Selector(rig, groups_of(score)), tempo, faults)
    if fibers is not None:
        mine = fibers[starts.fiber]
        picked = (getattr(starts, name)[mine] for name in ("fiber", "variant", "entry", "count", "stretch", "scale", "added"))
        starts = Starts(*picked, starts.variants, starts.entries)
    lines = phrase_lines(score, starts.variants, faults)
    found = moments(starts, lines, tempo, rig, faults)
    keep = np.flatnonzero(found.opens | (found.before < found.cut[found.instance]))
    ways = ways_of(found, starts, lines, abilities, keep)
    order = found.order
    first = np.cumsum(np.diff(lines.first)[starts.variant[order]]) if len(order) else np.empty(0, np.int64)
    begin = np.concatenate([[0], first])[:-1] if len(order) else first
    return Instances(
        fiber=starts.fiber[order],
        entry=starts.entry[order],
        backwards=np.array([back for _, back in starts.variants], dtype=bool)[starts.variant[order]]
        if len(order)
        else np.empty(0, dtype=bool),
        added=starts.added[order],
        start_s=found.start,
        start_count=starts.count[order],
        cut_s=found.cut,
        end_s=found.end,
        stretch=starts.stretch[order],
        scale=starts.scale[order],
        entries=tuple(starts.entries),
        phrases=lines.phrases,
        variant=starts.variant[order],
        instance=found.instance[keep],
        place=keep - begin[found.instance[keep]],
        row=found.row[keep],
        line=lines.phrase_line[found.row[keep]],
        written=lines.written,
        before_s=found.before[keep],
        leaves_s=ways.leaves,
        stops_s=ways.stops,
        arrives_s=ways.arrives,
        until_s=found.until[keep],
        a=ways.a,
        b=ways.b,
        goes=ways.goes & ~goes_nowhere(ways),
    ), faults
