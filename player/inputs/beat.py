"""A running tempo as a straight line, and the steady line through the moments at which a clock was heard."""

import math
from collections import deque
from dataclasses import dataclass
from fractions import Fraction

import numpy as np


@dataclass(frozen=True, slots=True)
class Beat:
    """Place `place` at `at_s`, moving on by `rate` a second; places are counts, or seconds of a score under time code."""

    place: float
    at_s: float
    rate: float

    def at(self, moment_s: float) -> float:
        """The place at a moment."""
        return self.place + self.rate * (moment_s - self.at_s)

    def when(self, place: float) -> float:
        """The moment of a place; infinity where time stands."""
        return self.at_s + (place - self.place) / self.rate if self.rate > 0.0 else math.inf

    def next_s(self, now_s: float, step: Fraction) -> float:
        """The next moment from `now_s` on whose place is a whole number of steps; `now_s` where time stands."""
        if self.rate <= 0.0:
            return now_s
        steps = math.ceil(self.at(now_s) / float(step) - 1e-6)
        return max(now_s, self.when(float(steps * step)))


MOST_TICKS = 96
FEWEST_TICKS = 12
TURN_S = 0.0015
"""How far the latest ticks may lie beside the line, on top of their noise, before the tempo is taken to have turned."""


class Steady:
    """Least squares through recent moments of a clock: steady under jitter, and short of memory once the tempo turns.

    A place is a whole number of ticks. While the latest ticks lie on the line of all that are remembered, the line is theirs;
    once their mean leaves it by more than their scatter explains, what came before the turn is forgotten.
    """

    def __init__(self, most: int = MOST_TICKS, fewest: int = FEWEST_TICKS):
        self._most, self._fewest = most, fewest
        self._heard: deque[tuple[int, float]] = deque(maxlen=most)
        self._line: tuple[float, float, float] | None = None

    def __len__(self) -> int:
        return len(self._heard)

    def clear(self) -> None:
        """Forget all."""
        self._heard.clear()
        self._line = None

    def add(self, tick: int, at_s: float) -> None:
        """A tick, later than all before."""
        self._heard.append((tick, at_s))
        self._line = None

    def line(self) -> tuple[float, float, float] | None:
        """A tick, its moment on the line, and seconds a tick; None before there are two, or where they take no time."""
        if self._line is None and len(self._heard) >= 2:
            ticks, times = np.array(self._heard, dtype=float).T
            self._line = self._fit(ticks, times)
            short = self._fewest
            while self._line is not None and len(ticks) > short and self._has_turned(ticks, times, self._line):
                keep = max(short, len(ticks) // 2)
                ticks, times = ticks[-keep:], times[-keep:]
                while len(self._heard) > keep:
                    self._heard.popleft()
                self._line = self._fit(ticks, times)
        return self._line

    def _fit(self, ticks: np.ndarray, times: np.ndarray) -> tuple[float, float, float] | None:
        # From the last tick, so that hours on the clock cost no digits.
        x, y = ticks - ticks[-1], times - times[-1]
        mean_x, mean_y = x.mean(), y.mean()
        spread = float(((x - mean_x) ** 2).sum())
        slope = float(((x - mean_x) * (y - mean_y)).sum()) / spread if spread > 0.0 else 0.0
        return (float(ticks[-1]), float(times[-1] + mean_y - slope * mean_x), slope) if slope > 0.0 else None

    def _has_turned(self, ticks: np.ndarray, times: np.ndarray, line: tuple[float, float, float]) -> bool:
        """Whether the newest ticks lie off the line of the older ones by more than chance."""
        tick, at_s, slope = line
        off = times - (at_s + slope * (ticks - tick))
        newest = self._fewest // 2
        noise = float(np.abs(np.diff(off, n=2)).mean()) / 1.95 if len(off) > 3 else 0.0
        return abs(float(off[-newest:].mean())) > min(TURN_S, 0.05 * slope * self._fewest) + 1.3 * noise
