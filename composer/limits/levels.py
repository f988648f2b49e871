"""Where tracks lie above or below a strain: the parts of segments, as shares of their time, exactly."""

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.polynomials import where_positive
from composer.limits.tables import travel_time_s
from composer.tracks import SUDDEN, Tracks, durations, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def past(tracks: Tracks, abilities: Abilities, segments: Index, level: Array, above: bool) -> tuple[Index, Array, Array]:
    """The parts of some segments that lie above a strain, or below it, each segment with a strain of its own.

    segments, level: (M,). Returns rows of `segments`, and from and to as shares of the segment's time, (P,) each.
    """
    sign = 1.0 if above else -1.0
    curve = sign * tracks.curve[segments]
    curve[:, 0] -= sign * level
    row, start, end = where_positive(curve)
    return row, time_share(tracks, abilities, segments[row], start), time_share(tracks, abilities, segments[row], end)


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
