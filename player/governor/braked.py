"""Fibers with a limit of acceleration: how fast one may be at the end of a tick and still stop where it is wanted.

In a tick such a fiber changes its speed at its limit for as long as that takes, and keeps it for the rest of the tick; it
never turns round within one. Let it go at u >= 0 towards a place that lies D ahead, and at e at the end of the tick. If
it gathers speed, it has gone u dt + (e - u) dt - (e - u)² / 2A, and stops after another e² / 2A; both together are D for
e = (D + u² / 2A) / (dt + u / A). If it loses speed, they are D for e² + (A dt - u) e + u² / 2 - A D = 0.
"""

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

THERE = 1e-13
"""A fiber that would stop within this strain of its place, and is as close to it, is there."""


def stops_at(strain: Array, rate: Array, accel: Array) -> Array:
    """The strain at which each fiber would stand if it braked from now on, any one shape."""
    return strain + rate * np.abs(rate) / (2.0 * accel)


def braked(
    strain: Array, rate: Array, wanted: Array, accel: Array, fill: Array, exhaust: Array, dt_s: float
) -> tuple[Array, Array]:
    """Strain and rate at the end of a tick of fibers that make for `wanted` within their rates and acceleration: (B,) each.

    fill, exhaust: fastest rates in 1/s, the same at every strain. Every fiber can still stop between rest and stroke
    afterwards, if it could before and `wanted` lies there.
    """
    ahead = wanted - stops_at(strain, rate, accel)
    way = np.where((ahead > 0.0) | ((ahead == 0.0) & (rate > 0.0)), 1.0, -1.0)
    now = way * rate
    distance = way * (wanted - strain)
    most = np.where(way > 0.0, fill, exhaust)
    change = accel * dt_s
    forward = np.maximum(now, 0.0)
    gathering = (distance + forward**2 / (2.0 * accel)) / (dt_s + forward / accel)
    room = np.maximum((change - now) ** 2 + 4.0 * accel * distance - 2.0 * now**2, 0.0)
    losing = 0.5 * (np.sqrt(room) - (change - now))
    end = np.where(gathering >= now, gathering, losing)
    end = np.maximum(np.minimum(end, np.minimum(most, now + change)), np.maximum(now - change, 0.0))
    end = np.where(now < 0.0, np.minimum(now + change, 0.0), end)
    gone = now * dt_s + (end - now) * (dt_s - np.abs(end - now) / (2.0 * accel))
    there = end**2 / (2.0 * accel) + np.abs(distance - gone) <= THERE
    return np.where(there, wanted, strain + way * gone), np.where(there, 0.0, way * end)
