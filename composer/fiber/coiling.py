"""Coiling fibers: a thread wound round a contractile or extensile fiber makes it a helix as it fills."""

import math
from dataclasses import dataclass

from composer.fiber.bending import KEYS as HELD
from composer.fiber.bending import held_problems
from composer.fiber.make import Make
from composer.keys import Key

KEYS = (
    *HELD,
    Key("constraint_pitch_mm", "number", "one turn of the thread round the fiber", unit="mm", low=0.1, high=1e5),
)


@dataclass(frozen=True, slots=True)
class Helix:
    """A helix of constant curvature and torsion in 1/m; its radius and its rise a turn in m follow, inf for a straight line."""

    curvature: float
    torsion: float

    @property
    def radius(self) -> float:
        """Radius in m: k / (k² + t²)."""
        return self.curvature / self._square if self._square > 0.0 else math.inf

    @property
    def rise(self) -> float:
        """Rise in m along the axis in one turn: 2 pi t / (k² + t²)."""
        return 2.0 * math.pi * self.torsion / self._square if self._square > 0.0 else math.inf

    @property
    def _square(self) -> float:
        return self.curvature**2 + self.torsion**2


@dataclass(frozen=True, slots=True, kw_only=True)
class Coiling:
    """The make of the fiber itself, the length in mm that the thread holds and its pitch in mm."""

    base: Make
    constraint_length_mm: float
    constraint_pitch_mm: float

    def turn_deg(self) -> float:
        """Degrees of theta = Lc e / r for a strain of 1: the bend that the same thread would give if it lay straight."""
        return math.degrees(self.constraint_length_mm / self.base.radius_mm)

    def stop(self) -> float:
        """Strain at which its base stops."""
        return self.base.shape().stop

    def helix(self, strain: float) -> Helix:
        """The helix of the centre line at a strain: k = (theta/Lc) cos² b, t = (theta/Lc) sin b cos b, tan b = 2 pi r / p."""
        radius = self.base.radius_mm * 1e-3
        winding = math.atan2(2.0 * math.pi * radius, self.constraint_pitch_mm * 1e-3)
        turn_per_m = strain / radius
        return Helix(turn_per_m * math.cos(winding) ** 2, turn_per_m * math.sin(winding) * math.cos(winding))

    def problems(self) -> list[tuple[str, str, str]]:
        """What cannot be about this make, as (key, found, expected)."""
        return [*self.base.problems(), *held_problems(self.base, self.constraint_length_mm)]
