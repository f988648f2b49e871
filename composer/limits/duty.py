"""The limit of duty: the on-time of a coil in any span L at most duty_burst_s + duty L."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.buckets import overdraws
from composer.limits.coil import OnTimes, coils_of, on_times
from composer.limits.limit import TOLERANCE, Limit
from composer.limits.snag import Snag
from composer.limits.stretches import line_of
from composer.rig.model import Rig
from composer.tracks import Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class OnTime:
    """The on-time of each coil as a function of time, straight lines between instants: those of f are first[f]:first[f + 1].

    first: (F + 1,); time_s, on_s: (N,) instant, and seconds energised up to it
    segment: (N,) the segment that ends at an instant and was energised, -1 where none was
    """

    first: Index
    time_s: Array
    on_s: Array
    segment: Index


def on_time(tracks: Tracks, rig: Rig, abilities: Abilities) -> OnTime:
    """The on-time of every fiber's coil, from 0 s on, with an instant at the start and the end of every energised segment."""
    return _added_up(on_times(tracks, rig, abilities), tracks.fibers)


def _added_up(on: OnTimes, fibers: int) -> OnTime:
    each = np.bincount(on.fiber, minlength=fibers)
    first = np.concatenate([[0], np.cumsum(2 * each + 1)])
    time, seconds = np.zeros(first[-1]), np.zeros(first[-1])
    segment = np.full(first[-1], -1)
    at = 2 * np.arange(len(on.fiber)) + on.fiber + 1
    time[at], time[at + 1] = on.from_s, on.from_s + on.seconds
    seconds[at + 1] = on.seconds
    segment[at + 1] = on.segment
    total = np.cumsum(seconds)
    return OnTime(first, time, total - np.repeat(total[first[:-1]], np.diff(first)), segment)


def shares(tracks: Tracks, rig: Rig, abilities: Abilities) -> Array:
    """The share of the score's whole length that each coil is energised, (F,)."""
    return shares_of(on_times(tracks, rig, abilities), tracks)


def shares_of(on: OnTimes, tracks: Tracks) -> Array:
    """The same, (F,), of on-times that are known already."""
    total = np.bincount(on.fiber, weights=on.seconds, minlength=tracks.fibers)
    return total / tracks.duration_s if tracks.duration_s > 0.0 else np.zeros(tracks.fibers)


def snags(tracks: Tracks, rig: Rig, abilities: Abilities) -> list[Snag]:
    """The spans that ask too much of a coil, the deepest of each stretch in which it has not recovered.

    From and to are the span; needs its seconds of on-time, has duty_burst_s + duty times its length.
    """
    return snags_of(on_times(tracks, rig, abilities), tracks, rig)


def snags_of(known: OnTimes, tracks: Tracks, rig: Rig) -> list[Snag]:
    """The snags of on-times that are known already."""
    coils, on = coils_of(rig), _added_up(known, tracks.fibers)
    total = on.on_s[on.first[1:] - 1]
    # While it is on, a coil falls behind by 1 - duty a second: one that does not get so far in all is in order.
    suspects = np.flatnonzero(total * (1.0 - coils.duty) > coils.burst_s * (1.0 + TOLERANCE))
    found = []
    for f in suspects:
        mine = slice(on.first[f], on.first[f + 1])
        time, seconds, segment = on.time_s[mine], on.on_s[mine], on.segment[mine]
        over = overdraws(time, seconds, coils.burst_s[f], coils.duty[f], TOLERANCE)
        for start, end, asked, bears in zip(over.start, over.end, over.asked, over.bears, strict=True):
            knot = int(segment[end])
            found.append(
                Snag(
                    kind="duty",
                    fiber=int(f),
                    from_s=float(time[start]),
                    to_s=float(time[end]),
                    needs=float(asked),
                    has=float(bears),
                    unit="s",
                    knot=knot,
                    line=line_of(tracks, knot),
                )
            )
    return found


LIMIT = Limit("duty", "s", "on-time of a coil in any span L at most duty_burst_s + duty * L", snags)
