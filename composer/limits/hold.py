"""The limit of holding: no longer than a fiber's max_hold_s above half of its usable stroke."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import least_durations, strain_range
from composer.limits.levels import lasting, past, reaches
from composer.limits.limit import TOLERANCE, Limit
from composer.limits.quivering import shaken
from composer.limits.snag import Snag
from composer.limits.stretches import join, line_of
from composer.rig.model import Rig
from composer.tracks import Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

SLACK = 1e-9
"""A strain this near half stroke is not above it."""


@dataclass(frozen=True, slots=True, eq=False)
class Runs:
    """Unbroken runs above half stroke, in pieces of segments, (P,) each, in order of run and then of time.

    run: number of the run, from 0 on; segment: index into the tracks; share: of the segment's time that the piece takes
    from_s, to_s: the piece in time. A run lasts the sum of share times what each segment lasts; the last hold of a fiber
    lasts up to the score's end.
    """

    run: Index
    segment: Index
    share: Array
    from_s: Array
    to_s: Array


def runs_above_half(tracks: Tracks, abilities: Abilities) -> Runs:
    """The runs above half stroke of all fibers that have a longest hold (a finite `max_hold_s`)."""
    fiber = fiber_of(tracks)
    bound = np.flatnonzero(np.isfinite(abilities.max_hold_s[fiber]))
    if len(bound):
        half = 0.5 * abilities.stroke[fiber[bound]] + SLACK
        _, high = reaches(tracks, *strain_range(tracks.curve[bound], tracks.shape[bound]), bound)
        bound = bound[high > half]
    row, start, end = past(tracks, abilities, bound, 0.5 * abilities.stroke[fiber[bound]] + SLACK, above=True)
    segment = bound[row]
    lasts = lasting(tracks)[segment]
    from_s, to_s = tracks.time_s[segment] + start * lasts, tracks.time_s[segment] + end * lasts
    order, run = join(fiber[segment], from_s, to_s)
    return Runs(run, segment[order], (end - start)[order], from_s[order], to_s[order])


def snags(tracks: Tracks, rig: Rig, abilities: Abilities) -> list[Snag]:
    """Every run above half stroke that lasts too long: needs its seconds, has the fiber's longest.

    Time mends none that lasts too long even with its moves at their fastest and nothing left of its holds.
    """
    runs = runs_above_half(tracks, abilities)
    if not len(runs.run):
        return []
    begin = np.flatnonzero(np.diff(runs.run, prepend=-1))
    from_s, to_s = runs.from_s[begin], np.maximum.reduceat(runs.to_s, begin)
    fiber = fiber_of(tracks)[runs.segment[begin]]
    longest = abilities.max_hold_s[fiber]
    ends = np.append(begin[1:], len(runs.run))
    found = []
    for r in np.flatnonzero(to_s - from_s > longest * (1.0 + TOLERANCE)):
        pieces = slice(begin[r], ends[r])
        knot = int(runs.segment[pieces][np.argmax(runs.to_s[pieces] - runs.from_s[pieces])])
        fastest = float(runs.share[pieces] @ _fastest(tracks, abilities, runs.segment[pieces]))
        found.append(
            Snag(
                kind="hold",
                fiber=int(fiber[r]),
                from_s=float(from_s[r]),
                to_s=float(to_s[r]),
                needs=float(to_s[r] - from_s[r]),
                has=float(longest[r]),
                unit="s",
                knot=knot,
                line=line_of(tracks, knot),
                mends=bool(fastest <= longest[r] * (1.0 + TOLERANCE)),
            )
        )
    return found


def _fastest(tracks: Tracks, abilities: Abilities, segments: Index) -> Array:
    """The least that each segment can last, (n,); 0 for a hold, and where a quiver's share hangs on how long it lasts."""
    least = least_durations(tracks, abilities, segments)
    least[~np.isfinite(least)] = 0.0
    if (moves := shaken(tracks)) is not None:
        least[np.isin(segments, moves.segment)] = 0.0
    return least


LIMIT = Limit("hold", "s", "no longer than the fiber's max_hold_s above half of its usable stroke", snags)
