"""A slow correction of pressure set-points from sensed strain: bounded, and frozen for a fiber of which something is wrong."""

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

PER_S = 0.15
"""The correction takes up this share of what is missing in a second: slow beside every move."""

MOST = 0.08
"""Share of full pressure by which a set-point is corrected at most."""

LONGEST_S = 0.2
"""A gap between senses counts as this long at most."""

STILL = 0.01
"""Only a fiber that is wanted to stand, to within this share of stroke, is corrected: one in motion is a little behind."""

OPEN = 0.02
"""Set-points below this are on their way to rest, and left alone."""


class Trim:
    """`by`: (F,) what is added to the set-points of fibers driven by pressure; others stay at 0."""

    def __init__(self, drives: tuple[str, ...]):
        self.by = np.zeros(len(drives))
        self._may = np.array([drive == "pressure" for drive in drives], dtype=bool)
        self._at_s = np.full(len(drives), -np.inf)

    def sense(self, at_s: float, fibers: NDArray[np.int64], share: Array, low: Array, high: Array, frozen: Array) -> None:
        """What was sensed of fibers (S,), shares of stroke, and the zone in which it was wanted; frozen: (F,)."""
        since = np.clip(at_s - self._at_s[fibers], 0.0, LONGEST_S)
        self._at_s[fibers] = at_s
        moves = self._may[fibers] & ~frozen[fibers] & (high - low < STILL) & (low > OPEN)
        missing = 0.5 * (low + high) - share
        self.by[fibers] = np.clip(self.by[fibers] + np.where(moves, PER_S * since * missing, 0.0), -MOST, MOST)

    def applied(self, command: Array) -> Array:
        """The set-points (F,) to be sent."""
        return np.where(self._may & (command > OPEN), np.clip(command + self.by, 0.0, 1.0), command)
