"""Where tracks lie above or below a strain: the parts of segments, as shares of their time, exactly."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import one_way
from composer.limits.polynomials import where_positive
from composer.limits.quivering import Shaken, shaken
from composer.limits.swings import strain_of, stretches
from composer.limits.tables import travel_time_s
from composer.quivers import NONE
from composer.tracks import SUDDEN, Tracks, durations, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def past(tracks: Tracks, abilities: Abilities, segments: Index, level: Array, above: bool) -> tuple[Index, Array, Array]:
    """The parts of some segments that lie above a strain, or below it, each segment with a strain of its own.

    segments, level: (M,). Returns rows of `segments`, and from and to as shares of the segment's time, (P,) each; where one
    quivers, each swing past the level is a part.
    """
    if (moves := shaken(tracks)) is not None:
        place, _ = moves.of(segments)
        if len(place):
            return _past_with_quivers(tracks, abilities, segments, level, above, moves)
    sign = 1.0 if above else -1.0
    curve = sign * tracks.curve[segments]
    curve[:, 0] -= sign * level
    row, start, end = where_positive(curve, one_way(tracks)[segments])
    return row, time_share(tracks, abilities, segments[row], start), time_share(tracks, abilities, segments[row], end)


def _past_with_quivers(
    tracks: Tracks, abilities: Abilities, segments: Index, level: Array, above: bool, moves: Shaken
) -> tuple[Index, Array, Array]:
    place, row = moves.of(segments)
    sign = 1.0 if above else -1.0

    def beyond(one: Index, u: Array) -> Array:
        return sign * (strain_of(tracks, segments[place[one]], u) - level[place[one]])

    which, start, end = stretches(tracks, moves, row, beyond)
    rest = np.delete(np.arange(len(segments)), place)
    bare = replace(tracks, quivers=NONE)
    row_of_rest, from_rest, to_rest = past(bare, abilities, segments[rest], level[rest], above)
    rows = np.concatenate([place[which], rest[row_of_rest]])
    start, end = np.concatenate([start, from_rest]), np.concatenate([end, to_rest])
    order = np.lexsort((start, rows))
    return rows[order], start[order], end[order]


def reaches(tracks: Tracks, low: Array, high: Array, segments: Index) -> tuple[Array, Array]:
    """The least and greatest strain of segments by their curves, widened by all that their quivers may add."""
    if (moves := shaken(tracks)) is not None:
        place, row = moves.of(segments)
        low, high = low.copy(), high.copy()
        low[place] -= moves.reach[row]
        high[place] += moves.reach[row]
    return low, high


def time_share(tracks: Tracks, abilities: Abilities, segments: Index, u: Array) -> Array:
    """The share of its time at which each segment has come to the share `u` of its curve, (P,).

    The two differ for `sudden` alone, whose curve is the way and not the time: there it is the time the way takes.
    """
    share = u.copy()
    sudden = np.flatnonzero(tracks.manner[segments] == SUDDEN)
    if len(sudden):
        of = segments[sudden]
        curve, fiber = tracks.curve[of], fiber_of(tracks)[of]
        start, end = curve[:, 0], curve.sum(axis=1)
        whole = travel_time_s(abilities, fiber, start, end)
        gone = travel_time_s(abilities, fiber, start, start + u[sudden] * (end - start))
        share[sudden] = np.where(u[sudden] == 1.0, 1.0, gone / np.where(whole > 0.0, whole, 1.0))
    return share


def lasting(tracks: Tracks) -> Array:
    """Seconds that each segment lasts, (K,), the last hold of each fiber up to the score's end."""
    lasts = durations(tracks)
    last = tracks.first[1:] - 1
    lasts[last] = np.maximum(tracks.duration_s - tracks.time_s[last], 0.0)
    return lasts
