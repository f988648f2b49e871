"""What a living cloth shows, as data that knows nothing of screens: made in any process, drawn by a widget."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.air import FREE_AIR_KPA, Demand, demand, refill_L_s
from composer.limits.buckets import level
from composer.limits.coil import coils_of
from composer.limits.duty import on_time
from composer.limits.snag import Snag
from composer.picture.bands import Band
from composer.picture.bars import Bars
from composer.picture.scene import CueMark, Lane, Stretch
from composer.rig.model import Rig
from composer.tracks import Tracks

Array = NDArray[np.float64]

LANE_COLUMNS = 4096
"""Columns that the whole length of a lane is cut into."""


@dataclass(frozen=True, slots=True, eq=False)
class Weave:
    """Tracks on fibers of such abilities, in the rig's order, with all that a cloth shows round them.

    bands, names: of the fibers; snags: `fiber` None for the air's; a snag is called by its index here
    pins_s: instants that must not move; lanes: their columns share the time from 0 to `to_s`
    """

    tracks: Tracks
    abilities: Abilities
    bands: tuple[Band, ...]
    names: tuple[str, ...]
    tempo: Bars
    snags: tuple[Stretch, ...] = ()
    pins_s: tuple[float, ...] = ()
    cues: tuple[CueMark, ...] = ()
    lanes: tuple[Lane, ...] = ()

    @property
    def to_s(self) -> float:
        """The score's length in s, never quite nothing."""
        return max(self.tracks.duration_s, 1e-3)


def stretches(snags: Sequence[Snag]) -> tuple[Stretch, ...]:
    """Snags of a check as a cloth shows them, in their order."""
    return tuple(Stretch(snag.fiber, snag.from_s, snag.to_s) for snag in snags)


def lanes_of(
    rig: Rig, abilities: Abilities, tracks: Tracks, columns: int = LANE_COLUMNS, asked: Demand | None = None
) -> tuple[Lane, ...]:
    """The receiver's pressure and the highest use of a coil's allowance, as the check reckons them, without simulating.

    asked: the air that these tracks draw, where it is known
    """
    edges = np.linspace(0.0, max(tracks.duration_s, 1e-3), columns + 1)
    return supply_lane(rig, abilities, tracks, edges, asked), duty_lane(rig, abilities, tracks, edges)


def supply_lane(rig: Rig, abilities: Abilities, tracks: Tracks, edges_s: Array, asked: Demand | None = None) -> Lane:
    """The lowest pressure of the receiver in each column, kPa gauge: what fibers draw and the compressor gives, at once.

    edges_s: (W + 1,) where columns begin and end
    """
    supply = rig.supply
    asked = demand(tracks, abilities) if asked is None else asked
    every = np.union1d(asked.time_s, edges_s)
    missing = level(every, np.interp(every, asked.time_s, asked.litres), refill_L_s(supply)).missing
    pressure = np.maximum(supply.max_receiver_kPa - missing * FREE_AIR_KPA / supply.receiver_L, 0.0)
    lowest = _worst(np.minimum, pressure, every, edges_s)
    least, most = supply.min_pressure_kPa, supply.max_receiver_kPa
    low = min(float(lowest.min(initial=most)), least)
    room = most - low
    return Lane(
        "receiver", "kPa gauge", lowest, max(0.0, low - 0.1 * room), most + 0.06 * room + 1.0, "supply", least, "minimum", True
    )


def duty_lane(rig: Rig, abilities: Abilities, tracks: Tracks, edges_s: Array) -> Lane:
    """The most of its allowance that any coil has used in each column, % (100: all of its burst is used)."""
    coils, on = coils_of(rig), on_time(tracks, rig, abilities)
    used = np.zeros(len(edges_s) - 1)
    for fiber in range(tracks.fibers):
        mine = slice(on.first[fiber], on.first[fiber + 1])
        if coils.duty[fiber] >= 1.0 or mine.stop - mine.start < 2:
            continue
        every = np.union1d(on.time_s[mine], edges_s)
        missing = level(every, np.interp(every, on.time_s[mine], on.on_s[mine]), float(coils.duty[fiber])).missing
        used = np.maximum(used, _worst(np.maximum, missing, every, edges_s) / max(float(coils.burst_s[fiber]), 1e-9))
    share = 100.0 * used
    most = max(112.0, 1.08 * float(share.max(initial=0.0)))
    return Lane("top duty", "% in use", share, 0.0, most, "duty", 100.0, "all used")


def _worst(extreme: np.ufunc, values: Array, times_s: Array, edges_s: Array) -> Array:
    """The extreme of a piecewise linear curve, known at `times_s` (which hold all the edges), in each column, (W,)."""
    begin = np.searchsorted(times_s, edges_s[:-1])
    inner = extreme.reduceat(values, begin)
    return extreme(inner, values[np.searchsorted(times_s, edges_s[1:])])
