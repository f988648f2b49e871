"""Fibers that are taken out of the score in mid-run: each goes to rest at its safe rate, and stays there."""

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from player.engine.ways import Ways, safe_ways

Array = NDArray[np.float64]


class SetDown:
    """Nothing, until `put` is called; then a bound from above on what is wanted of those fibers."""

    def __init__(self, abilities: Abilities):
        self._abilities = abilities
        self._down = np.zeros(len(abilities.stroke), dtype=bool)
        self._gone_s = np.zeros(len(abilities.stroke))
        self._ways: Ways | None = None

    def put(self, fiber: int, strain: Array) -> None:
        """Take a fiber out, from where it is wanted (F,) now; harmless when it is out already."""
        if self._down[fiber]:
            return
        a = strain.copy() if self._ways is None else self._ways.a.copy()
        a[fiber] = strain[fiber]
        self._ways = safe_ways(self._abilities, a, np.zeros_like(a))
        self._down[fiber], self._gone_s[fiber] = True, 0.0

    def limited(self, strain: Array, dt_s: float) -> Array:
        """What is wanted (F,) at the end of a tick, with those fibers on their way or at rest."""
        if self._ways is None:
            return strain
        self._gone_s += dt_s
        return self.coming(strain, np.zeros_like(strain))

    def coming(self, strain: Array, after_s: Array) -> Array:
        """The same, of what will be wanted `after_s` (F,) later."""
        if self._ways is None:
            return strain
        return np.where(self._down, np.minimum(strain, self._ways.at(np.maximum(self._gone_s + after_s, 0.0))), strain)
