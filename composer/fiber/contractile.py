"""Contractile fibers: an elastomer tube in an inextensible braid, which shortens as it swells."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber.make import COMMON, Make, Tube
from composer.keys import Key

Array = NDArray[np.float64]

COS2_LIMIT = 1.0 / 3.0
"""Squared cosine of the braid angle at which a braid encloses most and pulls no more: 54.7356°."""

KEYS = (
    *COMMON,
    Key("braid_angle_deg", "number", "between thread and axis, at rest", unit="°", low=1.0, high=54.7),
    Key("end_factor", "number", "for ends that are not cylindrical, k of Tondu and Lopez 2000", "1", 1.0, 2.0, default=1.0),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Contractile(Make):
    """The keys of a contractile fiber type, units in their names."""

    braid_angle_deg: float
    end_factor: float = 1.0

    direction = "contract"

    def shape(self) -> "Braid":
        """Its kinematics, in SI."""
        return Braid(
            **self.tube(),
            angle=math.radians(self.braid_angle_deg),
            k=self.end_factor,
        )

    def problems(self) -> list[tuple[str, str, str]]:
        """What cannot be about this make, as (key, found, expected)."""
        return self.wall_problems()


@dataclass(frozen=True, slots=True)
class Braid(Tube):
    """A braid of inextensible thread on an elastomer tube: lengths in m, modulus in Pa, angle at rest in radians.

    With l = 1 − k e the braid keeps cos a = l cos a0 and r = r0 sin a / sin a0 (Chou and Hannaford 1996); the end factor k
    divides the changes of volume and energy from rest, which gives Tondu and Lopez's (2000) force to the letter. The wall is a
    neo-Hookean tube of constant volume stretched by l along, sin a / sin a0 around, and what is left through.
    """

    angle: float
    k: float

    @property
    def stop(self) -> float:
        """Strain at which the braid angle reaches 54.7356°."""
        return (1.0 - math.sqrt(COS2_LIMIT) / math.cos(self.angle)) / self.k

    def volume(self, e: Array) -> Array:
        """Enclosed volume in m³, wall included."""
        rest = math.pi * self.radius**2 * self.length
        stretch = 1.0 - self.k * e
        return rest + (rest * stretch * self._around(stretch) - rest) / self.k

    def volume_slope(self, e: Array) -> Array:
        """dV/de in m³: pi r0² L0 (3 l² cos² a0 − 1) / sin² a0."""
        stretch = 1.0 - self.k * e
        rest = math.pi * self.radius**2 * self.length
        return rest * (3.0 * stretch**2 * math.cos(self.angle) ** 2 - 1.0) / math.sin(self.angle) ** 2

    def energy(self, e: Array) -> Array:
        """Elastic energy in J: Vw G/2 (l1² + l2² + l3² − 3), its change divided by k."""
        along = 1.0 - self.k * e
        around = self._around(along)
        return self.wall * self.modulus / 2.0 * (along**2 + around + 1.0 / (along**2 * around) - 3.0) / self.k

    def energy_slope(self, e: Array) -> Array:
        """dW/de in J."""
        along = 1.0 - self.k * e
        around = self._around(along)
        around_slope = -2.0 * along * math.cos(self.angle) ** 2 / math.sin(self.angle) ** 2
        through = 1.0 / (along**2 * around)
        slope = 2.0 * along + around_slope - through * (2.0 / along + around_slope / around)
        return -self.wall * self.modulus / 2.0 * slope

    def _around(self, along: Array) -> Array:
        """Squared stretch round the axis, sin² a / sin² a0."""
        return (1.0 - along**2 * math.cos(self.angle) ** 2) / math.sin(self.angle) ** 2
