"""What is sent to fibers known by their rates alone: a share of the stroke, or of the fastest rate in its direction."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits import tables
from composer.limits.abilities import Abilities

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class RatedInverse:
    """M fibers by their indices in a rig; `by_valve` (M,) which of them take a signed opening in place of a set-point."""

    abilities: Abilities
    members: Index
    by_valve: NDArray[np.bool_]

    def at(self, strain: Array) -> Array:
        """What is remembered of fibers that stand at strains (M,): just that."""
        return strain

    def commands(self, told: Array, strain: Array, soon: Array, ahead: Array, tick_s: float) -> tuple[Array, Array]:
        """What to send over ticks that are to end at `strain` (M, T), in drive units, and what to remember."""
        sent = np.clip(strain / self.abilities.stroke[self.members][:, None], 0.0, 1.0)
        if self.by_valve.any():
            rate = np.diff(strain, axis=1, prepend=told[:, None]) / tick_s
            fiber = np.broadcast_to(self.members[:, None], strain.shape)
            opening = np.clip(rate / tables.rates(self.abilities, fiber, strain, rate > 0.0), -1.0, 1.0)
            sent = np.where(self.by_valve[:, None], opening, sent)
        return sent, strain[:, -1].copy()
