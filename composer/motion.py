"""Where tracks are at any instant: strain and rate of every fiber, for a grid of times or for one instant after another."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.limits import tables
from composer.limits.abilities import Abilities
from composer.quivers import Over, over, rate_added, strain_added
from composer.tracks import SUDDEN, Tracks, durations, end_strain, fiber_of

Array = NDArray[np.float64]

BLOCK = 1 << 18
"""Values worked out at once, so that a grid of any size needs little memory beside its result."""

FEW = 4
"""Up to so many instants a fiber, one bisection for all fibers together is faster than one search a fiber."""


@dataclass(frozen=True, slots=True, eq=False)
class Motion:
    """Tracks made ready for asking: `lasts` (K,) seconds a segment, `travel` (K,) seconds a sudden one takes, 0 elsewhere,
    and the quivers by segment, None where there are none."""

    tracks: Tracks
    abilities: Abilities
    lasts: Array
    travel: Array
    quivers: Over | None


def motion_of(tracks: Tracks, abilities: Abilities) -> Motion:
    """The motion of tracks on fibers of such abilities."""
    travel = np.zeros(len(tracks.time_s))
    sudden = np.flatnonzero(tracks.manner == SUDDEN)
    if sudden.size:
        fiber = fiber_of(tracks)[sudden]
        travel[sudden] = tables.travel_time_s(abilities, fiber, tracks.curve[sudden, 0], end_strain(tracks)[sudden])
    return Motion(tracks, abilities, durations(tracks), travel, over(tracks.quivers, tracks.time_s))


def strain_at(tracks: Tracks, abilities: Abilities, times_s: ArrayLike) -> Array:
    """Strain (F, T) wanted of every fiber at `times_s`, (T,) for all fibers or (F, T) with times of each fiber's own.

    At a knot the segment that begins there counts, so a jump has happened. Before 0 s a fiber is as at 0 s. A
    sudden segment follows the fiber's rate table; one given less time than it needs runs through the same way faster.
    """
    return on_grid(motion_of(tracks, abilities), times_s, strain_in)


def rate_at(tracks: Tracks, abilities: Abilities, times_s: ArrayLike) -> Array:
    """Strain rate (F, T) in 1/s wanted of every fiber at `times_s`, as `strain_at`; at a knot the rate just after it."""
    return on_grid(motion_of(tracks, abilities), times_s, rate_in)


def on_grid(motion: Motion, times_s: ArrayLike, ask: Callable[..., Array]) -> Array:
    """Ask `strain_in` or `rate_in` of every fiber at every time, as `strain_at`: for whoever asks the same motion often."""
    times = np.maximum(times_s, 0.0)
    tracks = motion.tracks
    segment = segments_at(tracks, times)
    found = np.empty(segment.shape)
    rows = max(1, BLOCK // max(1, segment.shape[1]))
    for begin in range(0, tracks.fibers, rows):
        part = slice(begin, begin + rows)
        shape = segment[part].shape
        fiber = np.broadcast_to(np.arange(tracks.fibers)[part, None], shape)
        time = np.broadcast_to(times if times.ndim == 1 else times[part], shape)
        found[part] = ask(motion, fiber.ravel(), segment[part].ravel(), time.ravel()).reshape(shape)
    return found


def segments_at(tracks: Tracks, times_s: ArrayLike) -> NDArray[np.int64]:
    """The segment (F, T) that each fiber is in at `times_s`, (T,) or (F, T): the last to begin at or before then."""
    times = np.asarray(times_s, dtype=float)
    first, last = tracks.first[:-1], tracks.first[1:] - 1
    if times.ndim == 1 and len(times) > FEW:
        found = np.empty((tracks.fibers, len(times)), dtype=np.int64)
        for fiber, (begin, end) in enumerate(zip(first, last, strict=True)):
            found[fiber] = begin + tracks.time_s[begin + 1 : end + 1].searchsorted(times, side="right")
        return found
    low = np.broadcast_to(first[:, None], (tracks.fibers, times.shape[-1])).copy()
    high = np.broadcast_to(last[:, None], low.shape).copy()
    while np.any(low < high):
        middle = (low + high + 1) // 2
        begun = tracks.time_s[middle] <= times
        low = np.where(begun, middle, low)
        high = np.where(begun, high, middle - 1)
    return low


def strain_in(motion: Motion, fiber: NDArray[np.int64], segment: NDArray[np.int64], time_s: Array) -> Array:
    """Strain (n,) at instants that lie in these segments of these fibers, (n,) each."""
    tracks = motion.tracks
    share = _share(motion, segment, time_s)
    value = _polynomial(tracks.curve[segment], share)
    sudden = np.flatnonzero(tracks.manner[segment] == SUDDEN)
    if sudden.size:
        value[sudden] = _sudden_strain(motion, fiber[sudden], segment[sudden], share[sudden])
    if motion.quivers is not None:
        value += strain_added(motion.quivers, segment, time_s)
    return value


def rate_in(motion: Motion, fiber: NDArray[np.int64], segment: NDArray[np.int64], time_s: Array) -> Array:
    """Strain rate (n,) in 1/s at instants that lie in these segments of these fibers, (n,) each."""
    tracks = motion.tracks
    share = _share(motion, segment, time_s)
    value = _slope(tracks.curve[segment], share) * _one_over(motion.lasts[segment])
    sudden = np.flatnonzero(tracks.manner[segment] == SUDDEN)
    if sudden.size:
        value[sudden] = _sudden_rate(motion, fiber[sudden], segment[sudden], share[sudden])
    if motion.quivers is not None:
        value += rate_added(motion.quivers, segment, time_s)
    return value


class Cursor:
    """Asked for one instant after another, as a player does: it remembers where each fiber was, so going on costs little.

    Any order of instants gives the right answer; only going forward is the fast way.
    """

    def __init__(self, tracks: Tracks, abilities: Abilities):
        self._motion = motion_of(tracks, abilities)
        self._fibers = np.arange(tracks.fibers)
        self._jump(np.zeros(1))

    def at(self, time_s: float | Array) -> tuple[Array, Array]:
        """Strain (F,) and rate (F,) in 1/s at an instant, one for all fibers or (F,) with each fiber's own."""
        times = np.maximum(time_s, 0.0)  # tracks begin at 0 s, and before that a fiber is as it is then
        if np.any(times < self._begins):
            self._jump(times)
        for _ in range(FEW):
            behind = np.flatnonzero(times >= self._ends)
            if not behind.size:
                break
            self._enter(behind, self._segment[behind] + 1)
        else:
            self._jump(times)
        share = np.clip((times - self._begins) * self._per_second, 0.0, 1.0)
        strain = _polynomial(self._curve, share)
        rate = _slope(self._curve, share) * self._per_second
        if self._sudden.any():
            which = np.flatnonzero(self._sudden)
            segment = self._segment[which]
            strain[which] = _sudden_strain(self._motion, which, segment, share[which])
            rate[which] = _sudden_rate(self._motion, which, segment, share[which])
        quivers = self._motion.quivers
        if quivers is not None and self._quivering.any():
            which = np.flatnonzero(self._quivering)
            each = np.broadcast_to(times, self._fibers.shape)[which]
            strain[which] += strain_added(quivers, self._segment[which], each)
            rate[which] += rate_added(quivers, self._segment[which], each)
        return strain, rate

    def _jump(self, times: Array) -> None:
        each = np.broadcast_to(times.reshape(-1, 1), (len(self._fibers), 1))
        segment = segments_at(self._motion.tracks, each)[:, 0]
        self._segment = np.empty_like(segment)
        self._curve = np.empty((len(segment), 6))
        self._begins, self._ends, self._per_second = (np.empty(len(segment)) for _ in range(3))
        self._sudden, self._quivering = np.empty(len(segment), dtype=bool), np.zeros(len(segment), dtype=bool)
        self._enter(self._fibers, segment)

    def _enter(self, fibers: NDArray[np.int64], segment: NDArray[np.int64]) -> None:
        tracks = self._motion.tracks
        self._segment[fibers] = segment
        self._curve[fibers] = tracks.curve[segment]
        self._begins[fibers] = tracks.time_s[segment]
        last = segment == tracks.first[fibers + 1] - 1
        self._ends[fibers] = np.where(last, np.inf, tracks.time_s[np.minimum(segment + 1, len(tracks.time_s) - 1)])
        self._per_second[fibers] = _one_over(self._motion.lasts[segment])
        self._sudden[fibers] = tracks.manner[segment] == SUDDEN
        if (quivers := self._motion.quivers) is not None:
            self._quivering[fibers] = quivers.first[segment + 1] > quivers.first[segment]


def _one_over(lasts: Array) -> Array:
    """1 / lasts, 0 where a segment lasts no time or has no end."""
    return np.divide(1.0, lasts, out=np.zeros_like(lasts), where=lasts > 0.0)


def _share(motion: Motion, segment: NDArray[np.int64], time_s: Array) -> Array:
    gone = time_s - motion.tracks.time_s[segment]
    lasts = motion.lasts[segment]
    return np.clip(np.divide(gone, lasts, out=np.zeros_like(gone), where=lasts > 0.0), 0.0, 1.0)


def _polynomial(curve: Array, share: Array) -> Array:
    value = curve[:, 5] * share
    for power in (4, 3, 2, 1):
        value += curve[:, power]
        value *= share
    value += curve[:, 0]
    return value


def _slope(curve: Array, share: Array) -> Array:
    value = 5.0 * curve[:, 5] * share
    for power in (4, 3, 2):
        value += power * curve[:, power]
        value *= share
    value += curve[:, 1]
    return value


def _sudden_strain(motion: Motion, fiber: NDArray[np.int64], segment: NDArray[np.int64], share: Array) -> Array:
    start = motion.tracks.curve[segment, 0]
    end = start + motion.tracks.curve[segment, 1]
    return tables.strain_after(motion.abilities, fiber, start, end, share * motion.travel[segment])


def _sudden_rate(motion: Motion, fiber: NDArray[np.int64], segment: NDArray[np.int64], share: Array) -> Array:
    abilities = motion.abilities
    strain = _sudden_strain(motion, fiber, segment, share)
    rising = motion.tracks.curve[segment, 1] > 0.0
    fastest = np.where(rising, 1.0, -1.0) * tables.rates(abilities, fiber, strain, rising)
    # Given less time than it needs, the way is run through faster by that much.
    return fastest * motion.travel[segment] * _one_over(motion.lasts[segment])
