"""Moves of one shape: which of them stay within the slack of what was played, from which target to which.

A move from a to b is at (1 - w) a + w b when the share w of it is gone. So what was played at an instant, and its slack, leave
for each a a lowest and a highest b; all instants together leave what lies between the highest of the one and the lowest of the
other. Arrays are (instants, moves), so that all that is done goes along moves.
"""

import numpy as np
from numpy.typing import NDArray

from composer.limits.duration import PEAK_ACCELERATION, PEAK_SPEED
from composer.shapes import NAMES, PROGRESS
from player.takes.places import LEVELS, ROOM, Places
from player.takes.played import Array, Index, Played
from player.takes.watch import EVEN, Watch

NOT_QUITE = 0.995
"""Of the fastest rate: rates are looked up at some instants, and between the strains of a table."""

AT_ONCE = 1 << 13
"""Moves weighed at once, and values of (instants, moves): so few that they stay near the processor."""

VALUES = 1 << 15
LEAST_GONE = 1e-9

Mask = NDArray[np.bool_]


def fitting(played: Played, places: Places, source: Index, target: Index, shape: str, watch: Watch, rungs: Array) -> tuple:
    """The moves of one shape that fit: from, to, shape, masks as in `player.takes.moves.Moves`.

    rungs: of what was played
    """
    masks = np.zeros((len(source), LEVELS), dtype=np.uint8)
    for begin in range(0, len(source), AT_ONCE):
        part = slice(begin, begin + AT_ONCE)
        masks[part] = _Weighed(played, places, source[part], target[part], shape, rungs).against(watch).T
    good = np.flatnonzero(masks.any(axis=1))
    return source[good], target[good], np.full(len(good), NAMES.index(shape), dtype=np.int8), masks[good]


def progress_at(shape: str, u: Array) -> Array:
    """The share of its way that a move in a shape has gone at shares u of its time."""
    return u if shape == "linear" else _polynomial(PROGRESS[shape], u)


def _polynomial(powers: Array, u: Array) -> Array:
    """A polynomial, lowest power first, by Horner's rule."""
    last = int(np.flatnonzero(powers)[-1])
    value = np.full(u.shape, powers[last])
    for power in powers[:last][::-1]:
        value *= u
        if power:
            value += power
    return value


_SPEEDS = {name: np.polynomial.polynomial.polyder(powers) for name, powers in PROGRESS.items()}


class _Weighed:
    """Some moves of one shape. low, high: (LEVELS, E) what is left of b for each target a that they may begin at."""

    def __init__(self, played: Played, places: Places, source: Index, target: Index, shape: str, rungs: Array):
        self.played, self.places, self.shape = played, places, shape
        self.source, self.target = source, target
        self.series = places.series[source]
        self.begin, self.lasts = places.time_s[source], places.time_s[target] - places.time_s[source]
        self.begin_share, self.way = places.share[source], places.share[target] - places.share[source]
        levels = places.targets_of(source)
        self.levels = np.nan_to_num(levels)
        self.may = ~np.isnan(levels)
        number = NAMES.index(shape)
        bend = played.bend[self.series] * self.lasts**2 / max(PEAK_ACCELERATION[number], 1e-12) * NOT_QUITE
        self.low, self.high = self.levels - bend, self.levels + bend
        # Far below the fastest rate on the whole way there is nothing to look up at single instants.
        furthest = np.abs(self.way) + places.slack[source] + places.slack[target]
        ends = np.clip(np.stack([self.begin_share, self.begin_share + self.way]), 0.0, 1.0)
        least = played.least_rates(rungs, self.series, ends.min(axis=0), ends.max(axis=0), self.way > 0.0)
        self.fast = (self.lasts * least * NOT_QUITE / PEAK_SPEED[number] < furthest) & ~places.free[source]

    def against(self, watch: Watch) -> NDArray[np.uint8]:
        """Held against what was played: the targets that each may arrive at, as bits, (LEVELS, E)."""
        # At even instants first, by which most that do not fit are found out.
        size = VALUES // EVEN
        for begin in range(0, len(self.source), size):
            part = np.arange(begin, min(begin + size, len(self.source)))
            when = watch.even(self.source[part], self.target[part])
            series = self.series[part]
            self._hold(part, when, self.played.at(self.played.share, series, when), self.played.slack_at(series, when))
        left = np.flatnonzero(((self.low <= self.high) & self.may).any(axis=0))
        points = watch.points(self.source[left], self.target[left])
        for many in np.unique(points[points > 0]):
            mine = left[points == many]
            size = max(1, VALUES // int(many))
            for begin in range(0, len(mine), size):
                part = mine[begin : begin + size]
                self._hold(part, *watch.watched(self.source[part], self.target[part], int(many)))
        return self._masks()

    def _hold(self, part: Index, when: Array, met: Array, slack: Array) -> None:
        """Hold some of the moves to what was played at some instants, (T, P), and its slack."""
        u = (when - self.begin[part]) / self.lasts[part]
        gone = progress_at(self.shape, u)
        per = 1.0 / np.maximum(gone, LEAST_GONE)
        fast = np.flatnonzero(self.fast[part])
        if len(fast):
            self._hold_rates(part[fast], u[:, fast], gone[:, fast])
        slack = ROOM * slack
        top = (met + slack) * per
        bottom = (met - slack) * per
        # (1 - w) / w
        per -= 1.0
        come = np.empty_like(per)
        for k in range(int(self.places.many[self.source[part]].max(initial=1))):
            np.multiply(per, self.levels[k, part], out=come)
            self.high[k, part] = np.minimum(self.high[k, part], (top - come).min(axis=0))
            np.subtract(bottom, come, out=come)
            self.low[k, part] = np.maximum(self.low[k, part], come.max(axis=0))

    def _hold_rates(self, part: Index, u: Array, gone: Array) -> None:
        """Rates are looked up where the curve is that goes from what was played to what was played."""
        steepest = _polynomial(_SPEEDS[self.shape], u) + 1e-9
        share = self.begin_share[part] + self.way[part] * gone
        fastest = self.played.rates_at(self.series[part], share, self.way[part] > 0.0)
        reach = self.lasts[part] * (fastest / steepest).min(axis=0) * NOT_QUITE
        levels = self.levels[:, part]
        self.high[:, part] = np.minimum(self.high[:, part], levels + reach)
        self.low[:, part] = np.maximum(self.low[:, part], levels - reach)

    def _masks(self) -> NDArray[np.uint8]:
        places, target = self.places, self.target
        grain, lowest, many = places.grain[target], places.lowest[target], places.many[target]
        first = np.clip(np.ceil(self.low / grain - 1e-9) - lowest, 0, LEVELS).astype(np.int64)
        last = np.clip(np.floor(self.high / grain + 1e-9) - lowest, -1, many - 1).astype(np.int64)
        masks = np.where((last >= first) & self.may, (2 << np.maximum(last, 0)) - (1 << first), 0)
        short = self.lasts < self.played.rest_s[self.series]
        if self.shape == "linear" and short.any():
            same = np.rint(self.levels / grain - lowest)
            holds = short & (np.abs(self.levels - (lowest + same) * grain) < 1e-9) & (same >= 0) & (same < LEVELS)
            masks &= ~np.where(holds, 1 << np.clip(same, 0, LEVELS).astype(np.int64), 0)
        return masks.astype(np.uint8)
