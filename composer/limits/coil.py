"""When a fiber's coil is energised: while the fiber moves, and, where its valve says so, while it holds above rest."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import RESOLUTION
from composer.limits.levels import lasting
from composer.limits.stretches import join
from composer.rig.model import Rig
from composer.tracks import HOLD, STEP, Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Coils:
    """What the valves of F fibers bear: (F,) share of time, seconds beyond it, switches a second, whether holding energises."""

    duty: Array
    burst_s: Array
    switch_Hz: Array
    holding: NDArray[np.bool_]


def coils_of(rig: Rig) -> Coils:
    """The coils of a rig's fibers."""
    valves = [fiber.mounting.valve for fiber in rig.fibers]
    return Coils(
        duty=np.array([v.duty for v in valves], dtype=float),
        burst_s=np.array([v.duty_burst_s for v in valves], dtype=float),
        switch_Hz=np.array([v.max_switch_Hz for v in valves], dtype=float),
        holding=np.array([v.energised_while_holding for v in valves], dtype=bool),
    )


@dataclass(frozen=True, slots=True, eq=False)
class OnTimes:
    """The segments that energise a coil, (P,) each, in order of fiber and time; `stretch` numbers the unbroken stretches.

    seconds: what each adds to its coil's on-time; 0 for a jump, which starts the coil and takes no time
    """

    fiber: Index
    segment: Index
    from_s: Array
    seconds: Array
    stretch: Index


def on_times(tracks: Tracks, rig: Rig, abilities: Abilities) -> OnTimes:
    """All segments in which coils are energised; the hold at the end of a track counts up to the score's end."""
    fiber = fiber_of(tracks)
    moving = tracks.manner != HOLD
    # A jump too small for the drive changes nothing at the valve.
    small = np.abs(tracks.curve[:, 1:].sum(axis=1)) <= abilities.stroke[fiber] * RESOLUTION
    moving &= ~((tracks.manner == STEP) & small)
    lasts = lasting(tracks)
    holding = coils_of(rig).holding[fiber] & (tracks.manner == HOLD) & (lasts > 0.0)
    holding &= tracks.curve[:, 0] > abilities.stroke[fiber] * RESOLUTION
    segment = np.flatnonzero(moving | holding)
    order, stretch = join(fiber[segment], tracks.time_s[segment], tracks.time_s[segment] + lasts[segment])
    segment = segment[order]
    return OnTimes(fiber[segment], segment, tracks.time_s[segment], lasts[segment], stretch)
