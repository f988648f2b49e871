"""Fibers with a limit of acceleration: how fast one may be at the end of a tick and still stop where it is wanted.

In a tick such a fiber changes its speed at its limit for as long as that takes, and keeps it for the rest of the tick; it
never turns round within one. Let it go at u >= 0 towards a place that lies D ahead, and at e at the end of the tick. If
it gathers speed, it has gone u dt + (e - u) dt - (e - u)² / 2A, and stops after another e² / 2A; both together are D for
e = (D + u² / 2A) / (dt + u / A). If it loses speed, they are D for e² + (A dt - u) e + u² / 2 - A D = 0.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

ZERO, HALF, ONE = np.zeros(()), np.array(0.5), np.ones(())
"""As arrays: numpy takes as long to make one of a number as to go through fifty fibers."""

THERE, NEARLY_STILL = 1e-13, 1e-7
"""A fiber this close to its place in strain, and no faster than this share of what a tick can change, is there and still."""


@dataclass(frozen=True, slots=True, eq=False)
class Brakes:
    """What B fibers' limits of acceleration, 1/s², mean in a tick of `dt_s`, which is one number: (B,) each.

    change: of speed, at most; still: what is no speed any more; room: (A dt)² / 2; half_per: 1 / 2A
    """

    accel: Array
    dt_s: Array
    change: Array
    still: Array
    room: Array
    half_per: Array


def brakes_of(accel: Array, dt_s: float) -> Brakes:
    """Limits of acceleration (B,) made ready for ticks of `dt_s`."""
    change = accel * dt_s
    return Brakes(accel, np.array(dt_s), change, NEARLY_STILL * change, 0.5 * change * change, 0.5 / accel)


def braked(
    strain: Array, rate: Array, stop: Array, wanted: Array, brakes: Brakes, fill: Array, exhaust: Array
) -> tuple[Array, Array]:
    """Strain and rate at the end of a tick of fibers that make for `wanted` within their rates and acceleration: (B,) each.

    stop: where they would stand if they braked now; fill, exhaust: fastest rates in 1/s, the same at every strain. Every
    fiber can still stop between rest and stroke afterwards, if it could before and `wanted` lies there.
    """
    # It is done anew for every goal of a tick: each operation of numpy costs as much as fifty fibers, so they are few.
    accel, change = brakes.accel, brakes.change
    way = np.copysign(ONE, wanted - stop)
    now = way * rate
    distance = wanted - strain
    distance *= way
    faster = now + change
    needs = accel * distance
    # With q = u + A dt the root of the braking is √(A D + A² dt² / 2 - q² / 4) - (A dt - q / 2).
    room = brakes.room + needs
    half = HALF * faster
    room -= half * half
    np.maximum(room, ZERO, out=room)
    end = np.sqrt(room, out=room)
    half -= change
    end += half
    forward = np.maximum(now, ZERO)
    gathering = HALF * forward
    gathering *= forward
    gathering += needs
    forward += change
    gathering /= forward
    np.copyto(end, gathering, where=gathering >= now)
    # One that goes the other way stops first.
    most = np.where(way > ZERO, fill, exhaust)
    np.copyto(most, ZERO, where=now < ZERO)
    np.minimum(end, most, out=end)
    np.minimum(end, faster, out=end)
    least = np.minimum(faster, ZERO)
    np.maximum(least, now - change, out=least)
    np.maximum(end, least, out=end)
    now -= end
    gone = np.abs(now)
    gone *= now
    gone *= brakes.half_per
    gone += brakes.dt_s * end
    there = np.abs(end) <= brakes.still
    if np.count_nonzero(there):
        there &= np.abs(distance - gone) <= THERE
        np.copyto(end, ZERO, where=there)
        gone *= way
        gone += strain
        np.copyto(gone, wanted, where=there)
    else:
        gone *= way
        gone += strain
    end *= way
    return gone, end
