"""How well fibers land: error and lateness at every arrival, gathered from a run block by block."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.motion import segments_at
from composer.simulate.run import Block
from composer.tracks import HOLD, SAME_INSTANT_S, Tracks, durations, end_strain, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

PASSED = 0.95
"""A fiber has arrived once it has done this share of its move."""


@dataclass(frozen=True, slots=True, eq=False)
class Landings:
    """The arrivals of a run, H of them by time, and the worst of the whole way.

    segment, fiber, time_s: (H,) the moving segment that arrives, its fiber, the instant written
    error: (H,) strain there less strain wanted there
    late_s: (H,) seconds after the written instant at which the fiber had done 95 % of the move: 0 where it had by then,
        nan where it never did before the move after the next began
    largest: the |strain - target| that is the greatest share of its fiber's stroke at any tick within the score,
        largest_fiber and largest_s where it was
    """

    segment: Index
    fiber: Index
    time_s: Array
    error: Array
    late_s: Array
    largest: float
    largest_fiber: int
    largest_s: float


class LandingLog:
    """Watches a run of tracks on fibers of `stroke` (F,): `add` every block in order, then `landings`."""

    def __init__(self, tracks: Tracks, stroke: Array):
        moving = tracks.manner != HOLD
        fibers = fiber_of(tracks)
        time = tracks.time_s + durations(tracks)
        segments = np.flatnonzero(moving)
        self._tracks, self._stroke = tracks, stroke[:, None]
        self._segment = segments[np.argsort(time[segments], kind="stable")]
        self._fiber, self._time = fibers[self._segment], time[self._segment]
        start, self._end = tracks.curve[:, 0], end_strain(tracks)
        self._way = np.sign(self._end - start)
        self._goal = start + PASSED * (self._end - start)
        self._latest, self._previous = _latest_moves(moving, tracks.first)
        self._error = np.full(len(self._segment), np.nan)
        self._passed = np.full(len(tracks.time_s), np.inf)
        self._done = 0
        self._worst, self._largest = 0.0, (0.0, 0, 0.0)
        self._was: tuple[float, Array] | None = None

    def add(self, block: Block) -> None:
        """Take in the next ticks."""
        times, strain = block.time_s, block.strain
        if self._was is not None:
            times, strain = np.append(self._was[0], times), np.hstack([self._was[1][:, None], strain])
        self._land(times, strain)
        self._pass(times, strain)
        within = block.time_s <= self._tracks.duration_s + SAME_INSTANT_S
        wrong = np.abs(block.strain - block.target)[:, within] / self._stroke
        if wrong.size and wrong.max() > self._worst:
            fiber, tick = np.unravel_index(np.argmax(wrong), wrong.shape)
            self._worst = float(wrong[fiber, tick])
            self._largest = (self._worst * float(self._stroke[fiber, 0]), int(fiber), float(block.time_s[tick]))
        self._was = (float(times[-1]), strain[:, -1].copy())

    def landings(self) -> Landings:
        """All arrivals seen."""
        late = self._passed[self._segment] - self._time
        late = np.where(np.isfinite(late), np.maximum(late, 0.0), np.nan)
        return Landings(self._segment, self._fiber, self._time, self._error, late, *self._largest)

    def _land(self, times: Array, strain: Array) -> None:
        """The error at arrivals up to the last tick, on the straight line between the ticks beside them."""
        upto = int(np.searchsorted(self._time, times[-1] + SAME_INSTANT_S, side="right"))
        here = slice(self._done, upto)
        if upto > self._done:
            after = np.clip(np.searchsorted(times, self._time[here] - SAME_INSTANT_S), 0, len(times) - 1)
            before = np.maximum(after - 1, 0)
            gap = np.where(after > before, times[after] - times[before], 1.0)
            share = np.clip((self._time[here] - times[before]) / gap, 0.0, 1.0)
            fiber = self._fiber[here]
            there = strain[fiber, before] + share * (strain[fiber, after] - strain[fiber, before])
            self._error[here] = there - self._end[self._segment[here]]
        self._done = max(self._done, upto)

    def _pass(self, times: Array, strain: Array) -> None:
        """When each move was done, looked for until the second move after it begins."""
        move = self._latest[segments_at(self._tracks, times + SAME_INSTANT_S)]
        for _ in range(2):
            over = self._way[move] * (strain - self._goal[move])
            # A fiber that was past its goal a tick before, in the same move, has been seen.
            news = (over >= -SAME_INSTANT_S) & (move >= 0)
            news[:, 1:] &= ~news[:, :-1] | (move[:, 1:] != move[:, :-1])
            fiber, at = np.nonzero(news)
            segment = move[fiber, at]
            np.minimum.at(self._passed, segment, self._when(times, strain, segment, fiber, at))
            move = np.where(move >= 0, self._previous[move], -1)

    def _when(self, times: Array, strain: Array, segment: Index, fiber: Index, at: Index) -> Array:
        """The instant at which a fiber, past its goal at tick `at`, passed it on the straight line from the tick before."""
        before = np.maximum(at - 1, 0)
        step = strain[fiber, at] - strain[fiber, before]
        over = strain[fiber, at] - self._goal[segment]
        with np.errstate(over="ignore"):  # a fiber that has all but stopped: beyond 1 whatever it is
            back = np.clip(np.divide(over, step, out=np.zeros_like(step), where=step != 0.0), 0.0, 1.0)
        return times[at] - back * (times[at] - times[before])


def _latest_moves(moving: NDArray[np.bool_], first: Index) -> tuple[Index, Index]:
    """For each segment the latest moving one of its fiber up to it, and for that the one before; -1 where there is none."""
    number = np.where(moving, np.arange(len(moving)), -1)
    begins = np.repeat(first[:-1], np.diff(first))
    latest = np.maximum.accumulate(number) if len(number) else number
    latest = np.where(latest >= begins, latest, -1)
    previous = np.where(begins < np.arange(len(moving)), np.roll(latest, 1), -1)
    return latest, previous
