"""When every line of every instance is to be, once a retiming is taken in."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.edits.instances import Instances
from composer.retime.events import knot_times
from composer.retime.proof import Proof
from composer.tracks import HOLD, SAME_INSTANT_S, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]

BENT_S = 1e-7
"""Seconds by which a knot within a move may miss where the move as a whole would have it; beyond, no number says that."""

LEAST_S = 5e-9
"""Seconds by which a line must come after the one before it; nearer, they would be one instant."""


@dataclass(frozen=True, slots=True, eq=False)
class Wanted:
    """New instants for N instances and M lines of theirs, in s.

    start_s: (N,); leaves_s, arrives_s, until_s: (M,) as in Instances; bent: (N,) instances that no numbers can say
    """

    start_s: Array
    leaves_s: Array
    arrives_s: Array
    until_s: Array
    bent: Flags


def chosen_times(proof: Proof, from_s: float, to_s: float) -> Array:
    """(K,) new times of the proof's knots: those of hits that lie from one instant to another as written, and of the moves
    that land in them; all others as written."""
    tracks, events = proof.tracks, proof.events
    new = knot_times(events, proof.shift_s, tracks)
    within = (tracks.time_s >= from_s - SAME_INSTANT_S) & (tracks.time_s <= to_s + SAME_INSTANT_S)
    lands = np.append(within[1:], False) & (tracks.manner != HOLD)
    # A hold that was put in before a sudden move begins where that move's own line is.
    return np.where(np.where(events.arrival, within, lands), new, tracks.time_s)


def wanted(all_: Instances, tracks: Tracks, time_s: Array) -> Wanted:
    """New instants of what instances do; tracks: prepared for retiming, as written; time_s: (K,) new times of their knots."""
    found = Wanted(all_.start_s.copy(), all_.leaves_s.copy(), all_.arrives_s.copy(), all_.until_s.copy(),
                   np.zeros(len(all_.fiber), dtype=bool))  # fmt: skip
    lines_of = all_.lines_of
    owner = all_.fiber
    for fiber in np.unique(owner).tolist():
        low, high = int(tracks.first[fiber]), int(tracks.first[fiber + 1])
        was, now = tracks.time_s[low:high], time_s[low:high]
        if np.array_equal(was, now):
            continue
        for which in np.flatnonzero(owner == fiber).tolist():
            rows = np.arange(lines_of[which], lines_of[which + 1])
            _ways(found, all_, which, rows, was, now)
            _stays(found, all_, rows)
            _start(found, all_, which, rows, was, now, tracks.manner[low:high])
    return found


def _first(was: Array, at: float) -> int:
    return int(np.searchsorted(was, at - SAME_INSTANT_S))


def _last(was: Array, at: float) -> int:
    return int(np.searchsorted(was, at + SAME_INSTANT_S, side="right")) - 1


def _landing(was: Array, now: Array, at: float) -> float:
    """Where an instant at which something lands has gone; between knots, as far as its neighbours."""
    k = _first(was, at)
    return float(now[k]) if k < len(was) and abs(was[k] - at) <= SAME_INSTANT_S else _between(was, now, at)


def _leaving(was: Array, now: Array, at: float) -> float:
    k = _last(was, at)
    return float(now[k]) if k >= 0 and abs(was[k] - at) <= SAME_INSTANT_S else _between(was, now, at)


def _between(was: Array, now: Array, at: float) -> float:
    return float(np.interp(at, was, now)) if at < was[-1] else float(now[-1] + at - was[-1])


def _ways(found: Wanted, all_: Instances, which: int, rows: Index, was: Array, now: Array) -> None:
    """The moves: begin and end by their own knots, and the line as far behind as it was."""
    for row in rows[all_.goes[rows]].tolist():
        leaves, stops, arrives = float(all_.leaves_s[row]), float(all_.stops_s[row]), float(all_.arrives_s[row])
        jumps = stops <= leaves
        begins = _landing(was, now, leaves) if jumps else _leaving(was, now, leaves)
        ends = begins if jumps else _landing(was, now, stops)
        inside = slice(_last(was, leaves) + 1, _first(was, stops))
        if not jumps:
            straight = begins + (was[inside] - leaves) * ((ends - begins) / (stops - leaves))
            if len(straight) and np.abs(straight - now[inside]).max() > BENT_S:
                found.bent[which] = True
        if stops < arrives:  # what is cut goes on as if it were not
            line = all_.written[int(all_.row[row])]
            if line.shape == "sudden":
                ends += arrives - stops
            else:
                ends = begins + (ends - begins) * (arrives - leaves) / (stops - leaves) if stops > leaves else begins
        found.leaves_s[row], found.arrives_s[row] = begins, ends
        found.until_s[row] = ends + float(all_.until_s[row] - arrives)


def _own_start(all_: Instances, row: int) -> bool:
    """Whether a move starts by itself, not at the line before: `over`, or as late as it can."""
    line = all_.written[int(all_.row[row])]
    over = line.over is not None and not all_.backwards[all_.instance[row]]
    return over or line.shape in ("sudden", "step") or bool(all_.leaves_s[row] > all_.before_s[row] + SAME_INSTANT_S)


def _stays(found: Wanted, all_: Instances, rows: Index) -> None:
    """Lines that go nowhere: where the next move leaves, if it leaves there; else as written, in order."""
    still = rows[~all_.goes[rows]].tolist()
    for row in reversed(still):
        following = row + 1
        if following > rows[-1]:
            continue
        if all_.goes[following] and not _own_start(all_, following):
            found.until_s[row] = found.leaves_s[following]
        elif not all_.goes[following] and all_.until_s[row] >= all_.leaves_s[following] - SAME_INSTANT_S:
            found.until_s[row] = found.until_s[following] - float(all_.until_s[following] - all_.until_s[row])
    for row in still:
        if row == rows[0] and all_.place[row] == 0 and all_.until_s[row] <= all_.before_s[row]:
            continue  # where the phrase begins
        tied = row < rows[-1] and all_.goes[row + 1] and not _own_start(all_, row + 1)
        if not tied and row > rows[0]:  # it goes with what it holds
            found.until_s[row] = float(all_.until_s[row]) + float(found.until_s[row - 1] - all_.until_s[row - 1])
        low = float(found.until_s[row - 1]) + LEAST_S if row > rows[0] else -np.inf
        high = float(found.leaves_s[row + 1]) if row < rows[-1] and all_.goes[row + 1] else np.inf
        if high < low:
            # The hold has come to nothing, but a line has to come after the one before it.
            found.leaves_s[row + 1], high = low, low
        if not low <= found.until_s[row] <= high:
            gap = float(all_.until_s[row] - all_.before_s[row])
            found.until_s[row] = low + gap if row > rows[0] and low + gap <= high else high
    for row in still:
        found.leaves_s[row] = found.arrives_s[row] = found.until_s[row]


def _start(found: Wanted, all_: Instances, which: int, rows: Index, was: Array, now: Array, manner: Array) -> None:
    """Where an instance starts: at its first move where that leaves at once; else as written, if what is before lets it."""
    start = float(all_.start_s[which])
    if not len(rows):
        found.start_s[which] = _landing(was, now, start)
        return
    first = int(rows[0])
    if all_.until_s[first] <= start + SAME_INSTANT_S:
        found.start_s[which] = found.until_s[first]
        return
    if all_.goes[first] and not _own_start(all_, first):
        found.start_s[which] = found.leaves_s[first]
        return
    high = float(found.leaves_s[first] if all_.goes[first] else found.until_s[first])
    k = _last(was, start)
    at_knot = abs(was[k] - start) <= SAME_INSTANT_S
    if all_.added[which]:
        found.start_s[which] = min(start, high)
    elif at_knot and k > 0 and manner[_first(was, start) - 1] != HOLD and _first(was, start) > 0:
        found.start_s[which] = min(_landing(was, now, start), high)  # another is cut short there
    else:
        # It must not start before what was there before it has landed.
        low = float(now[k]) if manner[k] == HOLD else start
        found.start_s[which] = min(max(start, low), high)
