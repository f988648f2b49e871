"""Extensile fibers: an elastomer tube in a pleated sleeve that holds its radius, which lengthens as it fills."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber.make import COMMON, Make, Tube
from composer.keys import Key

Array = NDArray[np.float64]

KEYS = (
    *COMMON,
    Key("sleeve_limit", "number", "strain at which the sleeve is pulled straight", "1", 0.0, 10.0, above=True),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Extensile(Make):
    """The keys of an extensile fiber type, units in their names."""

    sleeve_limit: float

    direction = "extend"

    def shape(self) -> "Sleeve":
        """Its kinematics, in SI."""
        return Sleeve(
            **self.tube(),
            stop=self.sleeve_limit,
        )

    def problems(self) -> list[tuple[str, str, str]]:
        """What cannot be about this make, as (key, found, expected)."""
        return self.wall_problems()


@dataclass(frozen=True, slots=True)
class Sleeve(Tube):
    """A tube whose outer radius a pleated sleeve holds while its length is free: lengths in m, modulus in Pa.

    V = pi r0² L0 (1 + e), W = Vw G/2 (l² + l⁻² − 2) with l = 1 + e, so that P A = A_w G (l − l⁻³) without a load.
    """

    stop: float

    def volume(self, e: Array) -> Array:
        """Enclosed volume in m³, wall included."""
        return math.pi * self.radius**2 * self.length * (1.0 + e)

    def volume_slope(self, e: Array) -> Array:
        """dV/de in m³."""
        return np.full(np.shape(e), math.pi * self.radius**2 * self.length)

    def energy(self, e: Array) -> Array:
        """Elastic energy in J."""
        stretch = 1.0 + e
        return self.wall * self.modulus / 2.0 * (stretch**2 + stretch**-2 - 2.0)

    def energy_slope(self, e: Array) -> Array:
        """dW/de in J."""
        stretch = 1.0 + e
        return self.wall * self.modulus * (stretch - stretch**-3)
