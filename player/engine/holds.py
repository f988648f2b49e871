"""How long each fiber has been above half stroke, and its way down where it has been paused there for as long as it may be."""

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from player.engine.ways import safe_ways

Array = NDArray[np.float64]

HALF = 0.5
"""`max_hold_s` counts while a fiber is above this share of its stroke."""

LET_DOWN_TO = 0.45
"""Share of stroke to which a fiber is let down: low enough that its hold is over, no lower than that needs."""

QUICK = 1.05
"""Letting down takes this many times as long as the fiber needs at least."""


class Holds:
    """Watches fibers whose hold is limited, and lets down, in time, those that a pause keeps up for too long.

    A score that the checker passed keeps its holds within bounds by itself, so only a fiber whose present hold has a pause
    in it is ever let down. One that was let down follows the score again where the score comes down to it.
    """

    def __init__(self, abilities: Abilities):
        self._which = np.flatnonzero(np.isfinite(abilities.max_hold_s))
        self._abilities = abilities
        self._half = HALF * abilities.stroke[self._which]
        self._may_s = abilities.max_hold_s[self._which]
        full, low = abilities.stroke, LET_DOWN_TO * abilities.stroke
        self._down_s = safe_ways(abilities, full, low, QUICK).lasts_s[self._which] if self._which.size else np.empty(0)
        count = len(self._which)
        self._above_s = np.zeros(count)
        self._paused = np.zeros(count, dtype=bool)
        self._down = np.zeros(count, dtype=bool)
        self._gone_s = np.zeros(count)
        self._from = np.zeros(count)
        self._takes_s = np.ones(count)

    def follow(self) -> None:
        """Every fiber is where the score has it again; how long each has been up stays counted."""
        self._down[:] = False

    def watch(self, strain: Array, dt_s: float) -> None:
        """Count a tick that ends at these strains (F,), on the way between two places of the score."""
        above = strain[self._which] > self._half
        self._above_s = np.where(above, self._above_s + dt_s, 0.0)
        self._paused |= above

    @property
    def let_down(self) -> int:
        """How many fibers are held lower than the score has them."""
        return int(np.count_nonzero(self._down))

    def limited(self, strain: Array, dt_s: float, paused: bool) -> Array:
        """The strains (F,) wanted at the end of a tick, those of fibers that must come down replaced by their way down."""
        if not self._which.size:
            return strain
        wanted = strain[self._which]
        self._gone_s += dt_s
        low = LET_DOWN_TO / HALF * self._half
        share = np.clip(self._gone_s / self._takes_s, 0.0, 1.0)
        way = self._from + (low - self._from) * share**3 * (10.0 + share * (6.0 * share - 15.0))
        self._down &= wanted > way
        given = np.where(self._down, way, wanted)
        above = given > self._half
        self._above_s = np.where(above, self._above_s + dt_s, 0.0)
        self._paused = above & (self._paused | paused)
        due = self._paused & ~self._down & (self._above_s + self._down_s + 2.0 * dt_s >= self._may_s)
        if due.any():
            self._down |= due
            self._gone_s[due] = 0.0
            self._from[due] = given[due]
            self._takes_s[due] = self._down_s[due]
        limited = strain.copy()
        limited[self._which] = given
        return limited
