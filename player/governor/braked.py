"""Fibers with a limit of acceleration: how fast one may be at the end of a tick and still stop where it is wanted.

In a tick such a fiber changes its speed at its limit for as long as that takes, and keeps it for the rest of the tick; it
never turns round within one. Let it go at u >= 0 towards a place that lies D ahead, and at e at the end of the tick. If
it gathers speed, it has gone u dt + (e - u) dt - (e - u)² / 2A, and stops after another e² / 2A; both together are D for
e = (D + u² / 2A) / (dt + u / A). If it loses speed, they are D for e² + (A dt - u) e + u² / 2 - A D = 0.
"""

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

THERE, NEARLY_STILL = 1e-13, 1e-7
"""A fiber this close to its place in strain, and no faster than this share of what a tick can change, is there and still."""


def braked(
    strain: Array, rate: Array, stop: Array, wanted: Array, accel: Array, fill: Array, exhaust: Array, dt_s: float
) -> tuple[Array, Array]:
    """Strain and rate at the end of a tick of fibers that make for `wanted` within their rates and acceleration: (B,) each.

    stop: where they would stand if they braked now; fill, exhaust: fastest rates in 1/s, the same at every strain. Every
    fiber can still stop between rest and stroke afterwards, if it could before and `wanted` lies there.
    """
    way = np.copysign(1.0, wanted - stop)
    now = way * rate
    distance = way * (wanted - strain)
    change = accel * dt_s
    most = np.where(way > 0.0, fill, exhaust)
    forward = np.maximum(now, 0.0)
    needs = accel * distance
    gathering = (needs + 0.5 * forward * forward) / (change + forward)
    left = change - now
    room = np.maximum(left * left + 4.0 * needs - 2.0 * now * now, 0.0)
    end = np.where(gathering >= now, gathering, 0.5 * (np.sqrt(room) - left))
    end = np.minimum(end, np.minimum(most, now + change))
    end = np.maximum(end, np.maximum(now - change, 0.0))
    # One that goes the other way stops first.
    end = np.where(now < 0.0, np.minimum(now + change, 0.0), end)
    changed = end - now
    gone = now * dt_s + changed * (dt_s - 0.5 * np.abs(changed) / accel)
    there = (np.abs(end) <= NEARLY_STILL * change) & (np.abs(distance - gone) <= THERE)
    return np.where(there, wanted, strain + way * gone), np.where(there, 0.0, way * end)
