"""What is known of segments whatever their times: least durations and strain gone through, kept from one score to the next.

An edit changes few segments, and an editor asks again at every keystroke: all others are found by what they are.
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import least_durations
from composer.limits.fills import fills_of
from composer.quivers import NONE, pairs
from composer.retime.events import strain_gone
from composer.tracks import HOLD, Tracks, fiber_of

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Memory:
    """N segments known: what they are, in order, (N,) of bytes, and what they come to. For one rig's abilities alone.

    least_s, gone, litres: (N,) least duration, strain gone through, and free air drawn without quivers
    """

    what: NDArray[np.void]
    least_s: Array
    gone: Array
    litres: Array


def measured(tracks: Tracks, abilities: Abilities, memory: Memory | None) -> tuple[Array, Array, Array, Memory]:
    """Least duration, strain gone through and air drawn of every segment, (K,) each, and all of it as the next memory."""
    what = _what(tracks, abilities)
    place = np.zeros(len(what), dtype=np.int64)
    known = np.zeros(len(what), dtype=bool)
    if memory is not None and len(memory.what):
        place = np.minimum(np.searchsorted(memory.what, what), len(memory.what) - 1)
        known = memory.what[place] == what
    fresh = np.flatnonzero(~known)
    least, gone, litres = (np.zeros(len(what)) for _ in range(3))
    if memory is not None:
        there = place[known]
        least[known], gone[known], litres[known] = memory.least_s[there], memory.gone[there], memory.litres[there]
    if len(fresh):
        least[fresh] = least_durations(tracks, abilities, fresh)
        gone[fresh] = strain_gone(tracks, fresh)
        manner = np.full(len(what), HOLD, dtype=np.int8)
        manner[fresh] = tracks.manner[fresh]
        fills = fills_of(replace(tracks, manner=manner, quivers=NONE), abilities)
        litres += np.bincount(fills.segment, weights=fills.litres, minlength=len(what))
    kept, first = np.unique(what, return_index=True)
    return least, gone, litres, Memory(kept, least[first], gone[first], litres[first])


def _what(tracks: Tracks, abilities: Abilities) -> NDArray[np.void]:
    """Everything that a segment's least duration and strain depend on, as one item of bytes each, (K,)."""
    count, fiber, quivers = len(tracks.time_s), fiber_of(tracks), tracks.quivers

    segment, which = pairs(quivers) if len(quivers) else (np.empty(0, dtype=np.int64),) * 2
    amplitude, hertz = quivers.amplitude[which], quivers.hertz[which]

    def total(values: Array) -> Array:
        return np.bincount(segment, weights=values, minlength=count)

    highest = np.zeros(count)
    np.maximum.at(highest, segment, hertz)
    columns = np.column_stack(
        (
            abilities.which[fiber], abilities.accel[fiber], abilities.stroke[fiber], tracks.curve, tracks.manner, tracks.shape,
            total(np.ones(len(segment))), total(amplitude), total(amplitude * hertz), total(amplitude * hertz**2), highest,
        )
    )  # fmt: skip
    # Numbers that are equal have the same bytes but for the sign of nothing.
    columns = np.ascontiguousarray(columns + 0.0)
    return columns.view(np.dtype((np.void, columns.itemsize * columns.shape[1]))).ravel()
