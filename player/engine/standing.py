"""How far fibers stand from where they should, at rest and held, on the average of a run; and whether that grows run after run.

Pure. One run's offset is a matter of its day; what grows over several is a fit that is old, or a sensor that drifts. The
slope over the runs is the median of the slopes between all pairs of them (P. K. Sen, "Estimates of the regression coefficient
based on Kendall's tau", Journal of the American Statistical Association 63, 1968), which one odd run does not turn.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations
from statistics import median

import numpy as np
from numpy.typing import NDArray

from player.engine.alarms import HELD, STILL

Array = NDArray[np.float64]

WHERE = ("at rest", "held")
REST = 0.005
"""Shares of stroke below which a fiber that stands is at rest."""
FEW = 10
"""Of fewer senses nothing is said."""

RUNS = 4
"""So many runs there must be, the last among them, before anything is said."""
MOST_RUNS = 20
GROWN = 0.03
"""Share of stroke by which a fiber must have moved away over the runs to be told of."""


class Standing:
    """Takes what is sensed of fibers that are wanted to stand; `means` are shares of stroke (F, 2), sensed less wanted, at rest
    and held; nan where too little was sensed."""

    def __init__(self, fibers: int):
        self._sum = np.zeros((fibers, 2))
        self._count = np.zeros((fibers, 2), dtype=np.int64)

    def sense(self, fibers: NDArray[np.int64], share: Array, low: Array, high: Array, alarmed: NDArray[np.bool_]) -> None:
        """Shares sensed of fibers (S,), and the zone in which they were wanted of late; alarmed: (F,), left out."""
        honest = (high - low < STILL) & ~alarmed[fibers]
        for column, where in enumerate((high <= REST, low > HELD)):
            of = honest & where
            self._sum[fibers[of], column] += share[of] - 0.5 * (low[of] + high[of])
            self._count[fibers[of], column] += 1

    @property
    def means(self) -> Array:
        """(F, 2)."""
        return np.where(self._count >= FEW, self._sum / np.maximum(self._count, 1), np.nan)


@dataclass(frozen=True, slots=True)
class Drifting:
    """A fiber that stands further off from run to run: its index, "at rest" or "held", shares of stroke: now, and a run."""

    fiber: int
    where: str
    now: float
    a_run: float
    runs: int


def drifting(runs: Sequence[Array]) -> list[Drifting]:
    """What grows over runs, oldest first, each the means (F, 2) of one; worst first. Empty where there are fewer than RUNS."""
    found: list[Drifting] = []
    if len(runs) < RUNS:
        return found
    stood = np.stack(runs[-MOST_RUNS:])
    for fiber, column in np.ndindex(stood.shape[1:]):
        known = [(run, float(at)) for run, at in enumerate(stood[:, fiber, column]) if np.isfinite(at)]
        if len(known) < RUNS or known[-1][0] != len(stood) - 1:
            continue
        slope = median((b - a) / (later - run) for (run, a), (later, b) in combinations(known, 2))
        grown, now = slope * (known[-1][0] - known[0][0]), known[-1][1]
        if abs(grown) >= GROWN and grown * now > 0.0:
            found.append(Drifting(fiber, WHERE[column], now, slope, len(known)))
    return sorted(found, key=lambda one: -abs(one.now))
