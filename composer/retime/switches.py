"""Rows of `switching`: from one start of a coil to the next at least 1 / max_switch_Hz.

A rest as written keeps the two starts about it apart, however little is left of it: that is true for all times, and linear.
Where a move waits that did not wait as written, its coil may start once more: once some times open the wait, such a pair is
asked apart, or the wait to stay shut, whichever costs less.
"""

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.coil import coils_of, on_times
from composer.limits.duration import RESOLUTION
from composer.retime.events import Events
from composer.retime.rows import ALREADY, SWITCH_ROW, Rows, differences
from composer.rig.model import Rig
from composer.tracks import HOLD, SAME_INSTANT_S, STEP, Tracks, durations, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

Pair = tuple[int, int]
"""The segments with which two successive on-times of a coil begin."""

EXACT = 1e-7
"""Relative: starts that are too near by less are the solver's rounding."""


def may_follow_too_soon(tracks: Tracks, least_s: Array, rig: Rig) -> bool:
    """Whether any move can be done faster than its valve may switch; where none can, no starts ever follow too soon."""
    moving = np.flatnonzero(tracks.manner != HOLD)
    fastest = coils_of(rig).switch_Hz[fiber_of(tracks)[moving]]
    return bool((least_s[moving] * fastest < 1.0).any())


def kept_apart(tracks: Tracks, least_s: Array, rig: Rig, abilities: Abilities) -> list[Pair]:
    """The successive starts of prepared tracks, with a rest as written between them, that the moves alone do not keep apart."""
    if not may_follow_too_soon(tracks, least_s, rig):
        return []
    fiber, coils = fiber_of(tracks), coils_of(rig)
    resting = tracks.manner == HOLD
    above = tracks.curve[:, 0] > abilities.stroke[fiber] * RESOLUTION
    resting &= ~(coils.holding[fiber] & above)
    # A jump too small for the drive neither starts a coil nor lets it rest.
    small = np.abs(tracks.curve[:, 1:].sum(axis=1)) <= abilities.stroke[fiber] * RESOLUTION
    energised = np.flatnonzero(~resting & ~((tracks.manner == STEP) & small))
    rest_s = np.concatenate(([0.0], np.cumsum(np.where(resting, durations(tracks), 0.0))))[energised]
    begins = np.ones(len(energised), dtype=bool)
    begins[1:] = (fiber[energised[1:]] != fiber[energised[:-1]]) | (np.diff(rest_s) > SAME_INSTANT_S)
    start = energised[begins]
    first, then = start[:-1], start[1:]
    moves_s = np.concatenate(([0.0], np.cumsum(np.where(tracks.manner == HOLD, 0.0, least_s))))
    between = moves_s[then] - moves_s[first]
    near = (fiber[first] == fiber[then]) & (between * coils.switch_Hz[fiber[then]] < 1.0 - ALREADY)
    return list(zip(first[near].tolist(), then[near].tolist(), strict=True))


def too_soon(now: Tracks, rig: Rig, abilities: Abilities, known: set[Pair]) -> list[Pair]:
    """The successive starts of tracks with the times at hand that follow too soon and are not yet known."""
    on = on_times(now, rig, abilities)
    begin = np.flatnonzero(np.diff(on.stretch, prepend=-1))
    fiber, start, segment = on.fiber[begin], on.from_s[begin], on.segment[begin]
    soon = np.diff(start) * coils_of(rig).switch_Hz[fiber[1:]] < 1.0 - EXACT
    soon &= fiber[1:] == fiber[:-1]
    pairs = zip(segment[:-1][soon].tolist(), segment[1:][soon].tolist(), strict=True)
    return [pair for pair in pairs if pair not in known]


def switch_rows(pairs: list[Pair], tracks: Tracks, events: Events, rig: Rig) -> Rows:
    """One row a pair of starts of prepared tracks."""
    first, then = np.array(pairs, dtype=np.int64).reshape(-1, 2).T
    least = 1.0 / coils_of(rig).switch_Hz[fiber_of(tracks)[then]]
    end = _written(tracks, events, then)
    lack = least - (end - _written(tracks, events, first))
    # Rounding of written times, and what the checker lets pass, must not move what is no snag.
    allowed = ALREADY * least + 8.0 * np.spacing(np.abs(end))
    lack = np.where((lack > 0.0) & (lack <= allowed), 0.0, lack)
    apart = events.event[then] != events.event[first]
    return differences(events, events.event[then][apart], events.event[first][apart], lack[apart], SWITCH_ROW, then[apart])


def shut_rows(pairs: list[Pair], tracks: Tracks, events: Events) -> Rows:
    """One row a pair of which one follows a wait that is not in the score as written: nothing of that wait is left."""
    waits = (tracks.manner == HOLD) & (durations(tracks) <= SAME_INSTANT_S)
    start = np.array([then if then and waits[then - 1] else first for first, then in pairs], dtype=np.int64)
    start = np.unique(start[start > 0])
    start = start[waits[start - 1] & (events.event[start] != events.event[start - 1])]
    gap = _written(tracks, events, start) - _written(tracks, events, start - 1)
    return differences(events, events.event[start - 1], events.event[start], gap, SWITCH_ROW, start)


def _written(tracks: Tracks, events: Events, knot: Index) -> Array:
    """When knots are as written, as they hang from their events, (n,) s."""
    written = np.append(events.written_s, 0.0)
    return np.where(events.event[knot] < 0, tracks.time_s[knot], written[events.event[knot]] + events.offset_s[knot])
