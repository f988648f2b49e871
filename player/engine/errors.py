"""Wanted against sensed: the largest error of a run, from a bounded memory of what was wanted lately."""

import numpy as np
from numpy.typing import NDArray

from player.engine.status import WorstError

Array = NDArray[np.float64]

KEEP = 512
"""Ticks whose wants are remembered: what a board senses may come in that much later."""

GAP_S = 0.2
"""Where wants are further apart nothing was wanted between them."""


class Errors:
    """Remembers wants by their time and finds, for every strain sensed, how far it is from the want of that moment."""

    def __init__(self, fibers: int):
        self.worst: WorstError | None = None
        self.sensed = 0
        self._times = np.full(KEEP, np.nan)
        self._wants = np.zeros((KEEP, fibers))
        self._places = np.zeros(KEEP)
        self._count = 0

    def want(self, at_s: float, strain: Array, position_s: float) -> None:
        """Strains (F,) wanted at a time later than all before."""
        place = self._count % KEEP
        self._times[place], self._wants[place], self._places[place] = at_s, strain, position_s
        self._count += 1

    def sense(self, at_s: float, fibers: NDArray[np.int64], strain: Array) -> None:
        """Strains (S,) of those fibers as sensed at a time; between two wants the straight line counts."""
        have = min(self._count, KEEP)
        if have < 2:
            return
        order = np.arange(self._count - have, self._count) % KEEP
        times = self._times[order]
        later = int(np.searchsorted(times, at_s - 1e-9))
        if not 0 < later < have:
            return
        if times[later] - times[later - 1] > GAP_S:
            return
        a, b = order[later - 1], order[later]
        share = min(1.0, (at_s - times[later - 1]) / (times[later] - times[later - 1]))
        wanted = self._wants[a, fibers] + share * (self._wants[b, fibers] - self._wants[a, fibers])
        self.sensed += len(fibers)
        errors = np.abs(strain - wanted)
        worst = int(np.argmax(errors)) if errors.size else -1
        if worst >= 0 and (self.worst is None or errors[worst] > self.worst.error):
            self.worst = WorstError(
                float(errors[worst]), int(fibers[worst]), float(self._places[b]), float(wanted[worst]), float(strain[worst])
            )

    def around(self, at_s: float, slack_s: float, fibers: NDArray[np.int64]) -> tuple[Array, Array] | None:
        """The least and the greatest strain (S,) wanted of those fibers within `slack_s` of a time; None: not known."""
        have = min(self._count, KEEP)
        order = np.arange(self._count - have, self._count) % KEEP
        times = self._times[order]
        first, last = np.searchsorted(times, [at_s - slack_s, at_s + slack_s])
        # A want stands until the next one.
        near = order[max(int(first) - 1, 0) : int(last) + 1]
        if have < 2 or last == 0 or times[0] > at_s:
            return None
        wants = self._wants[near][:, fibers]
        return wants.min(axis=0), wants.max(axis=0)
