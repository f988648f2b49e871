"""What was played, made ready for fitting: shares of stroke on an even grid of time, what each may miss, how fast it may go."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.int64]


RATES = 513


@dataclass(frozen=True, slots=True, eq=False)
class Clock:
    """Seconds from rest to a share of stroke, and from it back to rest, as fast as a fiber goes: (G,) each."""

    share: Array
    up_s: Array
    down_s: Array


@dataclass(frozen=True, slots=True, eq=False)
class Played:
    """S series on a grid of M instants, `begin_s` and then every `step_s`.

    share: (S, M) of usable stroke; slack: (S, M) by how much a curve may miss it
    up, down: (S, RATES) the fastest rates at shares from 0 to 1, share a second; bend: (S,) greatest acceleration, share a s²
    start: (S,) where the curve begins, exactly; clocks: for each series, None where it may not go `sudden`
    rest_s: (S,) holds that are shorter are not wanted; watch: for each series, instants at which a curve is to be held
        against it besides those that its own corners ask for
    even: whether the slack of each series is the same throughout
    """

    begin_s: float
    step_s: float
    share: Array
    slack: Array
    up: Array
    down: Array
    bend: Array
    start: Array
    clocks: tuple[Clock | None, ...]
    rest_s: Array
    watch: tuple[Array, ...]
    even: bool

    @property
    def end_s(self) -> float:
        """The last instant of the grid."""
        return self.begin_s + self.step_s * (self.share.shape[1] - 1)

    def at(self, values: Array, series: Index, time_s: Array) -> Array:
        """`values` (S, M) of some series at some instants, any shape that both broadcast to; the ends hold beyond."""
        place = (time_s - self.begin_s) / self.step_s
        place = np.clip(place, 0.0, values.shape[1] - 1.0)
        low = np.minimum(place.astype(np.int64), max(values.shape[1] - 2, 0))
        flat = values.ravel()
        at = series * values.shape[1] + low
        left = flat[at]
        return left + (flat[np.minimum(at + 1, flat.size - 1)] - left) * (place - low)

    def part(self, series: Index | list[int]) -> "Played":
        """Some of the series."""
        names = ("share", "slack", "up", "down", "bend", "start", "rest_s")
        picked = {name: getattr(self, name)[series] for name in names}
        clocks, watch = (tuple(part[k] for k in series) for part in (self.clocks, self.watch))
        return replace(self, **picked, clocks=clocks, watch=watch)

    def slack_at(self, series: Index, time_s: Array) -> Array:
        """The slack of some series at some instants."""
        if self.even:  # as a rule
            return self.slack.ravel()[series * self.slack.shape[1]]
        return self.nearest(self.slack, series, time_s)

    def rates_at(self, series: Index, share: Array, rising: NDArray[np.bool_]) -> Array:
        """The fastest rates, share a second, at some shares of stroke; shapes broadcast."""
        at = series * RATES + np.clip(share * (RATES - 1) + 0.5, 0.0, RATES - 1).astype(np.int64)
        return np.stack([self.down.ravel(), self.up.ravel()])[rising.astype(np.int64), at]

    def least_rates(self, rungs: Array, series: Index, low: Array, high: Array, rising: NDArray[np.bool_]) -> Array:
        """The least of the fastest rates between two shares of stroke, share a second, (E,); rungs as of `rungs`."""
        first, last = (np.clip(s * (RATES - 1) + 0.5, 0.0, RATES - 1).astype(np.int64) for s in (low, high))
        lot = rising.astype(np.int64) * len(self.up) + series
        level = np.log2(last - first + 1).astype(np.int64)
        return np.minimum(rungs[level, lot, first], rungs[level, lot, last + 1 - (1 << level)])

    def rungs(self) -> Array:
        """The least of 1, 2, 4 and so on neighbouring rates: (rungs, series going down and then going up, RATES)."""
        found = [np.concatenate([self.down, self.up])]
        for level in range(RATES.bit_length() - 1):
            rung, ahead = found[-1].copy(), 1 << level
            rung[:, :-ahead] = np.minimum(rung[:, :-ahead], found[-1][:, ahead:])
            found.append(rung)
        return np.array(found)

    def nearest(self, values: Array, series: Index, time_s: Array) -> Array:
        """As `at`, of the nearest instant of the grid."""
        place = np.rint((time_s - self.begin_s) / self.step_s).astype(np.int64)
        return values.ravel()[series * values.shape[1] + np.clip(place, 0, values.shape[1] - 1)]
