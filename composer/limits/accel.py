"""The limit of acceleration, where a fiber's type gives one."""

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import acceleration_time_s, greatest_bend
from composer.limits.limit import TOLERANCE, Limit
from composer.limits.polynomials import derivative, where_positive
from composer.limits.quivering import least_with_quivers, shaken
from composer.limits.snag import Snag
from composer.limits.stretches import Pieces, as_snags, gather
from composer.rig.model import Rig
from composer.tracks import MOVE, SAME_INSTANT_S, Tracks, durations, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def least_s(tracks: Tracks, abilities: Abilities, segments: Index | None = None) -> Array:
    """Least seconds of each segment by acceleration alone, (K,) or one for each of `segments`; 0 but for moves."""
    of = np.arange(len(tracks.time_s)) if segments is None else segments
    least = np.zeros(len(of))
    mine = np.flatnonzero(tracks.manner[of] == MOVE)
    if len(mine) and np.isfinite(abilities.accel).any():
        at = of[mine]
        least[mine] = acceleration_time_s(abilities, fiber_of(tracks)[at], tracks.curve[at], tracks.shape[at])
        place, _, by_acceleration = least_with_quivers(tracks, abilities, of, fiber_of(tracks)[of], exact=False)
        least[place] = by_acceleration
    return least


def snags(tracks: Tracks, rig: Rig, abilities: Abilities) -> list[Snag]:
    """Every stretch in which |strain''| is above the fiber's limit: needs the greatest in the move, has the limit.

    A quiver's greatest comes on top of the move's, and where it alone is too much time does not mend it. Acceleration within a
    move counts; the corner at which one move meets the next, or a hold, has none that is finite.
    """
    if not np.isfinite(abilities.accel).any():
        return []
    lasts = durations(tracks)
    of = np.flatnonzero((lasts * np.sqrt(1.0 + TOLERANCE) < least_s(tracks, abilities)) & (lasts > SAME_INSTANT_S))
    if not len(of):
        return []
    fiber = fiber_of(tracks)[of]
    limit, square = abilities.accel[fiber], lasts[of] ** 2
    needs = greatest_bend(tracks.curve[of], tracks.shape[of]) / square
    shake = np.zeros(len(of))
    if (shaking := shaken(tracks)) is not None:
        place, row = shaking.of(of)
        shake[place] = shaking.bend[row]
    needs += shake
    mends = shake < limit * (1.0 + TOLERANCE)
    lots = []
    for sign in (1.0, -1.0):
        over = sign * derivative(derivative(tracks.curve[of]))
        over[:, 0] -= square * (limit * (1.0 + 0.5 * TOLERANCE) - shake)
        row, start, end = where_positive(over)
        lots.append(
            Pieces(
                fiber=fiber[row],
                from_s=tracks.time_s[of[row]] + start * lasts[of[row]],
                to_s=tracks.time_s[of[row]] + end * lasts[of[row]],
                needs=needs[row],
                has=limit[row],
                knot=of[row],
                mends=mends[row],
            )
        )
    return as_snags("accel", "1/s²", gather(*lots), tracks)


LIMIT = Limit("accel", "1/s²", "no strain acceleration above the type's accel_per_s2, where it gives one", snags, least_s)
