"""Where a score takes its fibers back after a take: what it would have done with them, and the way there.

A fiber is handed back where the score has it still, or where a move of the score begins, as soon as it can be there. From then
on it does what the score would have had it do until the next of the score's own entries begins on it.
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.faults import Fault, Faults
from composer.limits.abilities import Abilities
from composer.limits.duration import PEAK_ACCELERATION, PEAK_SPEED
from composer.limits.tables import slowest_rates
from composer.quivers import NONE, Quivers
from composer.rig.model import Rig
from composer.score.expand_lines import phrase_lines
from composer.score.expand_starts import Starts
from composer.score.expand_times import moments
from composer.score.layers import knots_of
from composer.score.model import Score
from composer.score.sums import summed
from composer.score.tempo import TempoMap, with_text
from composer.shapes import NAMES
from composer.tracks import HOLD, SAME_INSTANT_S, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]

SMOOTH = NAMES.index("smooth")

ROOM = 1.05
"""Over the least time that the way back may take."""

UNHURRIED_S = 1.0
"""The way back takes as long as this where the score leaves it the time."""

NOWHERE = 1e-9
"""Strain by which a fiber that is there may be off."""


@dataclass(frozen=True, slots=True)
class Back:
    """How one fiber comes back: from `leaves_s` on its way to the strain `there`, where it is at `from_s`."""

    fiber: int
    leaves_s: float
    from_s: float
    there: float


def some_of(starts: Starts, which: NDArray[np.bool_]) -> Starts:
    """Some starts of a score, the others as if they had never been written."""
    names = ("fiber", "variant", "entry", "count", "stretch", "scale", "added")
    return replace(starts, **{name: getattr(starts, name)[which] for name in names})


def tracks_of_starts(starts: Starts, score: Score, rig: Rig, abilities: Abilities, tempo: TempoMap) -> Tracks:
    """What some of a score's starts alone would have the rig do. Raises Faults, those of the score itself."""
    faults: list[Fault] = []
    lines = phrase_lines(score, starts.variants, faults)
    found = moments(starts, lines, tempo, rig, faults)
    if faults:
        raise Faults(with_text(faults, score))
    owner = np.concatenate([np.arange(len(rig.fibers)), starts.fiber[starts.added]])
    knots, timed = knots_of(found, starts, lines, abilities, len(owner))
    return summed(knots, timed, owner, len(rig.fibers), 0.0, abilities)


def ways_back(base: Tracks, abilities: Abilities, fibers: Index, strain: Array, end_s: float, until_s: float) -> list[Back]:
    """How fibers that a take leaves at some strains at `end_s` come back to where a score has them, before `until_s`.

    base: the score without what is added; fibers, strain: (P,). Fibers that need no way back, because they are there and the
    score does nothing more with them, are left out.
    """
    found = []
    for fiber, now in zip(fibers, strain, strict=True):
        back = _way_back(base, abilities, int(fiber), float(now), end_s)
        goes_on = float(base.time_s[base.first[fiber + 1] - 1]) > back.from_s + SAME_INSTANT_S
        if (abs(back.there - now) > NOWHERE or goes_on) and back.leaves_s < until_s:
            found.append(back)
    return found


def _way_back(base: Tracks, abilities: Abilities, fiber: int, now: float, end_s: float) -> Back:
    first, last = int(base.first[fiber]), int(base.first[fiber + 1]) - 1
    at = first + max(int(np.searchsorted(base.time_s[first : last + 1], end_s, side="right")) - 1, 0)
    for k in range(at, last + 1):
        there = float(base.curve[k, 0])
        takes = _takes_s(abilities, fiber, now, there)
        begins = float(base.time_s[k])
        ends = float(base.time_s[k + 1]) if k < last else np.inf
        still = base.manner[k] == HOLD
        if begins >= end_s + takes - SAME_INSTANT_S and (k > at or begins >= end_s):
            # A move of the score begins here, or a hold: be there, without haste.
            return Back(fiber, max(end_s, begins - max(takes, UNHURRIED_S)), begins, there)
        if still and end_s + takes <= ends:
            arrives = min(ends, end_s + max(takes, UNHURRIED_S)) if takes > 0.0 else end_s
            return Back(fiber, end_s, arrives, there)
    raise AssertionError("the last hold has no end")


def _takes_s(abilities: Abilities, fiber: int, a: float, b: float) -> float:
    """Seconds that a smooth move between two strains takes at most, as fast as a fiber goes."""
    if abs(b - a) <= NOWHERE:
        return 0.0
    low, high = np.array([min(a, b)]), np.array([max(a, b)])
    fill, exhaust = slowest_rates(abilities, np.array([fiber]), low, high)
    rate = float(fill[0] if b > a else exhaust[0])
    by_rate = PEAK_SPEED[SMOOTH] * abs(b - a) / rate
    by_accel = np.sqrt(PEAK_ACCELERATION[SMOOTH] * abs(b - a) / float(abilities.accel[fiber]))
    return ROOM * float(max(by_rate, by_accel))


def between(tracks: Tracks, fiber: int, from_s: float, until_s: float) -> Tracks:
    """One fiber's track from a knot of it, or a hold, up to an instant; nothing before, a hold after, quivers cut there.

    The result has as many fibers, the others at rest; where `until_s` lies within a move, that move is cut off.
    """
    first, last = int(tracks.first[fiber]), int(tracks.first[fiber + 1])
    time, curve, manner = tracks.time_s[first:last], tracks.curve[first:last], tracks.manner[first:last]
    ends = np.append(time[1:], np.inf)
    mine = np.flatnonzero((ends > from_s + SAME_INSTANT_S) & (time < until_s - SAME_INSTANT_S))
    begins = np.maximum(time[mine], from_s)
    cut = curve[mine].copy()
    over = ends[mine] > until_s
    for row in np.flatnonzero(over & np.isfinite(ends[mine])):
        cut[row] = _cut(cut[row], (until_s - begins[row]) / (ends[mine][row] - time[mine][row]))
    stop = min(until_s, float(ends[mine][-1])) if len(mine) else until_s
    held = np.zeros((1, 6))
    if len(mine):
        held[0, 0] = cut[-1].sum() if manner[mine][-1] != HOLD else cut[-1, 0]
    keeps = np.isfinite(stop)
    columns = {
        "time_s": np.append(begins, [stop] if keeps else []),
        "curve": np.concatenate([cut, held]) if keeps else cut,
        "manner": np.append(manner[mine], [HOLD] if keeps else []).astype(np.int8),
        "shape": np.append(tracks.shape[first:last][mine], [-1] if keeps else []).astype(np.int8),
    }
    quivers = _quivers_between(tracks, fiber, first, last, columns["time_s"], from_s, until_s)
    count, fibers = len(columns["time_s"]), tracks.fibers
    divided = np.concatenate([np.arange(fiber + 1), fiber + count + np.arange(fibers - fiber)])
    for name, still in (("time_s", 0.0), ("manner", HOLD), ("shape", -1)):
        values = columns[name]
        columns[name] = np.concatenate([np.full(fiber, still), values, np.full(fibers - fiber - 1, still)]).astype(values.dtype)
    columns["curve"] = np.concatenate([np.zeros((fiber, 6)), columns["curve"], np.zeros((fibers - fiber - 1, 6))])
    none = np.zeros(len(columns["time_s"]), dtype=np.int32)
    return Tracks(divided, **columns, line=none, phrase_line=none, duration_s=float(columns["time_s"].max()), quivers=quivers)


def _cut(curve: Array, share: float) -> Array:
    """The first share of a segment, as a segment of its own."""
    return curve * share ** np.arange(6)


def _quivers_between(
    tracks: Tracks, fiber: int, first: int, last: int, time_s: Array, from_s: float, until_s: float
) -> Quivers:
    quivers = tracks.quivers
    mine = np.flatnonzero((quivers.knot >= first) & (quivers.knot < last))
    begins = np.maximum(tracks.time_s[quivers.knot[mine]], from_s)
    ends = np.minimum(tracks.time_s[quivers.until[mine]], until_s)
    left = ends > begins + SAME_INSTANT_S
    if not left.any():
        return NONE
    mine, begins, ends = mine[left], begins[left], ends[left]
    knot = np.searchsorted(time_s, begins, side="right") - 1
    until = np.searchsorted(time_s, ends - SAME_INSTANT_S, side="left")
    return Quivers(fiber + knot, fiber + until, quivers.hertz[mine], quivers.amplitude[mine])
