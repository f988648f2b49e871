"""When every line of every instance happens, in seconds, and where a later entry cuts it short."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.faults import Fault
from composer.rig.model import Rig
from composer.score.bounds import RANGES
from composer.score.expand_lines import Lines
from composer.score.expand_starts import MOST_FAULTS, Starts
from composer.score.model import Entry, Span
from composer.score.tempo import TempoMap, fault_at
from composer.shapes import NAMES
from composer.tracks import SAME_INSTANT_S

Array = NDArray[np.float64]
Index = NDArray[np.int64]

NO_LINES, NO_COUNTS = np.empty(0, dtype=np.int64), np.empty(0)

STEPS = NAMES.index("step")

LONGEST_S = float(RANGES["seconds"].high)
"""A score may last so long: as long as a place in seconds may be written."""


@dataclass(frozen=True, slots=True, eq=False)
class Moments:
    """N instances in order of chain and start, and their M lines in that order. A chain is what moves as one: a fiber with
    all entries that take over from one another, or one instance of an `add` entry.

    order: (N,) index into Starts; chain: (N,) the fiber's index, or from `fibers` on one for each added layer
    start, cut, end: (N,) s: where it starts, where the next of its chain takes over (inf: never), where it is over
    instance, row: (M,) index into these instances and into Lines; opens: (M,) first line of its instance
    before, leaves, arrives, until: (M,) s: the line before (or the start), the move's own start and end, the line
    """

    order: Index
    chain: Index
    start: Array
    cut: Array
    end: Array
    instance: Index
    row: Index
    opens: NDArray[np.bool_]
    before: Array
    leaves: Array
    arrives: Array
    until: Array


def moments(starts: Starts, lines: Lines, tempo: TempoMap, rig: Rig, faults: list[Fault]) -> Moments:
    """All instants of a score; instants within SAME_INSTANT_S become one float. Faults are added to `faults`."""
    chain = starts.fiber
    if np.count_nonzero(starts.added):
        chain = np.where(starts.added, len(rig.fibers) + starts.added.cumsum() - 1, chain)
    order = np.lexsort((starts.count, chain))
    chain, count = chain[order], starts.count[order]
    variant, stretch = starts.variant[order], starts.stretch[order]

    sizes = (lines.first[1:] - lines.first[:-1])[variant]
    stop = sizes.cumsum()
    begin = stop - sizes
    instance = np.arange(len(order)).repeat(sizes)
    row = np.arange(len(instance)) + (lines.first[variant] - begin)[instance]
    opens = np.zeros(len(row), dtype=bool)
    opens[begin] = True

    # All starts, ends and lines at once: a call costs more than a conversion.
    of, by = np.concatenate([np.arange(len(order)), instance]), np.concatenate([lines.length[variant], lines.offset[row]])
    counts = _counts_after(tempo, count[of], by, stretch[of])
    # Few phrases have moves of their own length, fewer are played backwards: what no line has is not looked for.
    over = lines.has_over[row].nonzero()[0] if np.count_nonzero(lines.has_over) else NO_LINES
    lasts = lines.has_lasts[row].nonzero()[0] if np.count_nonzero(lines.has_lasts) else NO_LINES
    back = lines.over[row[over]] * stretch[instance[over], None]
    # Back from a line's counts, where no bars and seconds lie between.
    at_once = not (np.count_nonzero(lines.offset[:, 2]) or np.count_nonzero(lines.over[:, 0]))
    begins = counts[len(order) + over] - back[:, 1] if at_once else NO_COUNTS
    seconds = tempo.seconds(np.concatenate([count, counts, begins]))
    seconds[len(count) : len(count) + len(counts)] += by[:, 2] * stretch[of]
    start, end, until, begins = _parted(seconds, (len(order), len(order), len(row), len(begins)))
    sources = [start, end, until]
    if over.size:
        sources.append(begins - back[:, 2] if at_once else _shifted(tempo, until[over], -back))
    if lasts.size:
        before = _before(until, start, instance, opens)
        sources.append(_shifted(tempo, before[lasts], lines.lasts[row[lasts]] * stretch[instance[lasts], None]))
    start, end, until, *others = _snapped(sources)

    before = _before(until, start, instance, opens)
    leaves, arrives = before.copy(), until.copy()
    if over.size:
        leaves[over] = others.pop(0)
    if lasts.size:
        arrives[lasts] = others.pop(0)
    step = (((lines.shape == STEPS) & ~lines.has_lasts)[row]).nonzero()[0]
    leaves[step] = until[step]
    cut = np.full(len(order), np.inf)
    taken = (chain[1:] == chain[:-1]).nonzero()[0]
    cut[taken] = start[taken + 1]
    found = Moments(order, chain, start, cut, end, instance, row, opens, before, leaves, arrives, until)
    _check_starts(found, starts, rig, faults)
    _check_lines(found, starts, lines, rig, faults)
    _check_length(found, starts, faults)
    return found


def _before(until: Array, start: Array, instance: Index, opens: NDArray[np.bool_]) -> Array:
    before = np.empty_like(until)
    before[1:] = until[:-1]
    before[opens] = start[instance[opens]]
    return before


def _counts_after(tempo: TempoMap, count: Array, by: Array, stretch: Array) -> Array:
    """Counts of the places that lie `by`, (n, 3) parts of TIME_UNITS times `stretch`, after `count`, up to parts in seconds."""
    if (some := by[:, 0].nonzero()[0]).size:
        count = count.copy()
        count[some] = tempo.counts_of_bars(tempo.bars(count[some]) + by[some, 0] * stretch[some])
    return count + by[:, 1] * stretch


def _shifted(tempo: TempoMap, seconds: Array, by: Array) -> Array:
    """Seconds of the places that lie `by`, (n, 3) parts of TIME_UNITS, after instants in seconds."""
    if not np.count_nonzero(by[:, :2]):
        return seconds + by[:, 2]
    counts = tempo.counts(seconds)
    if (some := by[:, 0].nonzero()[0]).size:
        counts[some] = tempo.counts_of_bars(tempo.bars(counts[some]) + by[some, 0])
    moved = tempo.seconds(counts + by[:, 1])
    return np.where((by[:, 0] != 0.0) | (by[:, 1] != 0.0), moved, seconds) + by[:, 2]


def _snapped(sources: list[Array]) -> list[Array]:
    """The same instants, those that are one within SAME_INSTANT_S as one float: the earliest of them."""
    every = np.concatenate(sources)
    order = every.argsort()
    rising = every[order]
    leads = np.ones(len(rising), dtype=bool)
    leads[1:] = (rising[1:] - rising[:-1]) > SAME_INSTANT_S
    every[order] = rising[leads][leads.cumsum() - 1]
    return _parted(every, [len(part) for part in sources])


def _parted(values: Array, sizes: Sequence[int]) -> list[Array]:
    """Views of values end to end."""
    parts, at = [], 0
    for size in sizes:
        parts.append(values[at : at + size])
        at += size
    return parts


def _check_starts(found: Moments, starts: Starts, rig: Rig, faults: list[Fault]) -> None:
    """Two entries that take over on one fiber at one instant: one fault for each pair of entries."""
    both = (found.cut == found.start).nonzero()[0]
    if not both.size:
        return
    entry = starts.entry[found.order]
    pairs, first, count = np.unique(
        np.column_stack([entry[both], entry[both + 1]]), axis=0, return_index=True, return_counts=True
    )
    for (a, b), k, times in zip(pairs[:MOST_FAULTS], first, count, strict=False):
        one, other = sorted((starts.entries[a], starts.entries[b]), key=lambda entry: entry.span.line)
        where = found.start[both[k]]
        name = rig.fibers[int(found.chain[both[k]])].name
        more = f" and {times - 1} more such starts" if times > 1 else ""
        lines = (
            f"the entry of line {other.span.line}"
            if one is other
            else f"the entries of lines {one.span.line} and {other.span.line}"
        )
        faults.append(
            fault_at(
                other.span,
                f"{lines} start{'s twice' if one is other else ''} on '{name}' at one instant, {where:.6g} s{more}",
                "one that takes over",
                "start one of them later, or write 'add' to one",
            )
        )


def _check_lines(found: Moments, starts: Starts, lines: Lines, rig: Rig, faults: list[Fault]) -> None:
    """Offsets that do not rise, moves that reach back too far, lengths too short, once all are seconds."""
    flat = (found.until <= found.before) & ~found.opens
    reach = (found.leaves < found.before) | (found.arrives > found.until)
    short = found.until > found.end[found.instance]
    if not np.count_nonzero(flat | reach | short):
        return
    flat &= (found.until < found.before) | ~lines.shut[found.row]
    short[:-1] &= found.opens[1:]

    def tell(wrong: NDArray[np.bool_], what: str, expected: str, place: str) -> None:
        seen: set[Span] = set()
        for k in np.flatnonzero(wrong):
            line = lines.written[found.row[k]]
            span = {"offset": line.offset.span, "over": (line.over or line.offset).span, "line": line.span}[place]
            if span in seen:
                continue
            seen.add(span)
            faults.append(fault_at(span, what + _playing(found, starts, rig, int(k)), expected))
            if len(seen) > MOST_FAULTS:
                return

    tell(flat & ~reach, "this line comes no later than the one before it", "offsets that rise", "offset")
    tell(reach, "this move would begin before the line before it", "an 'over' that fits between them", "over")
    seen: set[Span] = set()
    for k in np.flatnonzero(short):
        phrase = lines.phrases[starts.variant[found.order[found.instance[k]]]]
        span = phrase.span if phrase.length is None else phrase.length.span
        if phrase.length is not None and span not in seen:
            seen.add(span)
            faults.append(
                fault_at(
                    span,
                    f"phrase '{phrase.name}' is declared shorter than its last line" + _playing(found, starts, rig, int(k)),
                    "a length that holds all its lines",
                )
            )


def _check_length(found: Moments, starts: Starts, faults: list[Fault]) -> None:
    """No instance may end later than seconds can be told apart to a nanosecond; the entry that ends last is named."""
    latest = float(max(found.end.max(initial=0.0), found.until.max(initial=0.0)))
    if latest > LONGEST_S:
        last = found.end.argmax() if len(found.end) else 0
        span = starts.entries[starts.entry[found.order[last]]].span
        faults.append(fault_at(span, f"the score lasts {latest:.4g} s", f"at most {LONGEST_S:.0f} s", "cut it in parts"))


def _playing(found: Moments, starts: Starts, rig: Rig, move: int) -> str:
    """Which entry and fiber brought a phrase's fault to light: units meet only where it is played."""
    which = found.order[found.instance[move]]
    entry: Entry = starts.entries[starts.entry[which]]
    return f", as '{rig.fibers[int(starts.fiber[which])].name}' plays it from line {entry.span.line}"
