"""The limit of switching: no coil is energised more often than its valve can switch.

A switch is the start of energising, as `coil` defines it. Moves that follow one another without a hold are one stretch
and one start; two starts closer than 1 / max_switch_Hz are a snag, which more time between them mends. A quiver has its
valve change over twice a period, and where that is too often, time mends nothing.
"""

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.coil import OnTimes, coils_of, on_times
from composer.limits.limit import TOLERANCE, Limit
from composer.limits.snag import Snag
from composer.limits.stretches import Pieces, as_snags, gather
from composer.rig.model import Rig
from composer.tracks import Tracks

Array = NDArray[np.float64]


def snags(tracks: Tracks, rig: Rig, abilities: Abilities) -> list[Snag]:
    """Every stretch of starts that follow too soon: needs switches a second where they are closest, has the most."""
    return snags_of(on_times(tracks, rig, abilities), tracks, rig)


def snags_of(on: OnTimes, tracks: Tracks, rig: Rig) -> list[Snag]:
    """The snags of on-times that are known already."""
    begin = np.flatnonzero(np.diff(on.stretch, prepend=-1))
    fiber, start, segment = on.fiber[begin], on.from_s[begin], on.segment[begin]
    most = coils_of(rig).switch_Hz
    apart = np.diff(start)
    soon = np.flatnonzero((fiber[1:] == fiber[:-1]) & (apart * most[fiber[1:]] < 1.0 - TOLERANCE))
    starts = Pieces(
        fiber=fiber[soon],
        from_s=start[soon],
        to_s=start[soon + 1],
        needs=1.0 / apart[soon],
        has=most[fiber[soon]],
        knot=segment[soon + 1],
        mends=np.ones(len(soon), dtype=bool),
    )
    return as_snags("switching", "Hz", gather(starts, _quivers(tracks, most)), tracks)


def _quivers(tracks: Tracks, most: Array) -> Pieces:
    """The quivers that change over more often than their fiber's valve can."""
    quivers = tracks.quivers
    fiber = np.searchsorted(tracks.first, quivers.knot, side="right") - 1
    fast = 2.0 * quivers.hertz > most[fiber] * (1.0 + TOLERANCE)
    knot, until, fiber = quivers.knot[fast], quivers.until[fast], fiber[fast]
    return Pieces(
        fiber=fiber,
        from_s=tracks.time_s[knot],
        to_s=tracks.time_s[until],
        needs=2.0 * quivers.hertz[fast],
        has=most[fiber],
        knot=knot,
        mends=np.zeros(len(fiber), dtype=bool),
    )


LIMIT = Limit("switching", "Hz", "no two starts of a coil closer than one over its valve's max_switch_Hz", snags)
