"""Where instants of a score as written have gone once it is retimed, and back."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Warp:
    """Instants as written and as retimed, both (N,) rising from 0; a straight line between, one pace beyond the last."""

    was_s: Array
    now_s: Array

    def now(self, was_s: float) -> float:
        """Where a written instant has gone."""
        return float(along(was_s, self.was_s, self.now_s))

    def was(self, now_s: float) -> float:
        """Where a retimed instant was written."""
        return float(along(now_s, self.now_s, self.was_s))


UNWARPED = Warp(np.zeros(1), np.zeros(1))


def along(at: ArrayLike, here: Array, there: Array) -> Array:
    """Instants, any shape, taken from one side of a warp to the other; before the first and beyond the last as far as those."""
    at = np.asarray(at, dtype=float)
    if not len(here):
        return at
    between = np.interp(at, here, there)
    before, beyond = at < here[0], at >= here[-1]
    return np.where(before, there[0] + at - here[0], np.where(beyond, there[-1] + at - here[-1], between))
