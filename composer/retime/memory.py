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
    """K segments known: what they are, (K, C) numbers, and what they come to. For one rig's abilities alone.

    key: (K,) a number made of what each is, least_s, gone, litres: (K,) least duration, strain gone through, and free air drawn
    without quivers
    """

    what: Array
    key: NDArray[np.uint64]
    least_s: Array
    gone: Array
    litres: Array


def measured(tracks: Tracks, abilities: Abilities, memory: Memory | None) -> tuple[Array, Array, Array, Memory]:
    """Least duration, strain gone through and air drawn of every segment, (K,) each, and all of it as the next memory."""
    what = _what(tracks, abilities)
    key = _key(what)
    known, place = _known(what, key, memory)
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
    return least, gone, litres, Memory(what, key, least.copy(), gone, litres)


def _known(what: Array, key: NDArray[np.uint64], memory: Memory | None) -> tuple[NDArray[np.bool_], NDArray[np.int64]]:
    """(K,) which segments a memory holds, and where."""
    # The first quiver, and the last, changes what is kept of each.
    if memory is None or not len(memory.key) or memory.what.shape[1] != what.shape[1]:
        return np.zeros(len(what), dtype=bool), np.zeros(len(what), dtype=np.int64)
    if len(key) == len(memory.key) and np.count_nonzero(key != memory.key) <= len(key) // 4:
        # After most edits nearly all are where they were.
        place = np.arange(len(key))
        known = np.all(what == memory.what, axis=1)
        rest = np.flatnonzero(~known)
    else:
        known, place, rest = np.zeros(len(key), dtype=bool), np.zeros(len(key), dtype=np.int64), np.arange(len(key))
    if len(rest):
        order = np.argsort(memory.key, kind="stable")
        there = order[np.minimum(np.searchsorted(memory.key[order], key[rest]), len(order) - 1)]
        # Two that are not the same may have one key, so what they are decides.
        known[rest], place[rest] = np.all(what[rest] == memory.what[there], axis=1), there
    return known, place


def _key(what: Array) -> NDArray[np.uint64]:
    """(K,) a number made of all bits of each row."""
    bits = what.view(np.uint64)
    key = np.zeros(len(what), dtype=np.uint64)
    for column in range(bits.shape[1]):
        key = (key ^ bits[:, column]) * np.uint64(0x9E3779B97F4A7C15)
        key ^= key >> np.uint64(29)
    return key


def _what(tracks: Tracks, abilities: Abilities) -> Array:
    """Everything that a segment's least duration and strain depend on, as numbers, (K, C)."""
    count, fiber, quivers = len(tracks.time_s), fiber_of(tracks), tracks.quivers
    what = np.empty((count, 11 + (5 if len(quivers) else 0)))
    what[:, 0], what[:, 1], what[:, 2] = abilities.which[fiber], abilities.accel[fiber], abilities.stroke[fiber]
    what[:, 3:9], what[:, 9], what[:, 10] = tracks.curve, tracks.manner, tracks.shape
    if len(quivers):
        segment, which = pairs(quivers)
        amplitude, hertz = quivers.amplitude[which], quivers.hertz[which]
        for column, values in enumerate((np.ones(len(segment)), amplitude, amplitude * hertz, amplitude * hertz**2), 11):
            what[:, column] = np.bincount(segment, weights=values, minlength=count)
        what[:, 15] = 0.0
        np.maximum.at(what[:, 15], segment, hertz)
    # Numbers that are equal have the same bits but for the sign of nothing.
    what += 0.0
    return what
