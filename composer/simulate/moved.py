"""What every kind of simulated fiber is to the rig: states that follow from states, and one table of kinds."""

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Moved:
    """Fibers after a step: `strain` (M,), `pressure_kPa` (M,) gauge, nan where unknown, and free air drawn by all, in L.

    A kind whose state is more than that adds fields of its own in a subclass.
    """

    strain: Array
    pressure_kPa: Array
    drawn_L: float


class Simulated(Protocol):
    """Fibers of one kind, all at once.

    indifferent_kPa: the receiver's pressure at and above which it makes no difference to them
    """

    indifferent_kPa: float

    def at(self, strain: Array) -> Moved:
        """Fibers at such strains (M,), in balance."""
        ...

    def after(self, was: Moved, dt_s: float, command: Array, supply_kPa: float) -> Moved:
        """The fibers after `dt_s` of a constant command (M,), in drive units, with such a pressure in the receiver."""
        ...
