"""What every fiber modelled from its make has in common: its keys, and the checks that they fit together."""

import math
from dataclasses import dataclass

from composer.keys import Key

COMMON = (
    Key("rest_length_mm", "number", "length at rest", unit="mm", low=1.0, high=1e5),
    Key("outer_diameter_mm", "number", "outer diameter of the tube at rest, where the braid or sleeve lies", "mm", 0.2, 200.0),
    Key("wall_mm", "number", "thickness of the elastomer tube", unit="mm", low=0.0, above=True, high=50.0),
    Key("shear_modulus_kPa", "number", "shear modulus of the elastomer", unit="kPa", low=0.0, high=1e5),
    Key("friction_fraction", "number", "dry friction over ideal force, for hysteresis", "1", 0.0, 0.5, default=0.0),
    Key("settle_ms", "number", "viscous lag of elastomer and braid", unit="ms", low=0.0, high=5000.0, default=0.0),
    Key("max_pressure_kPa", "number", "never blown harder than this, gauge", "kPa", 0.0, 2000.0, above=True),
    Key("rated_cycles", "integer", "strokes that it is rated for", low=1, high=10**12, default=None),
)


@dataclass(frozen=True, slots=True)
class Tube:
    """An elastomer tube at rest: length, outer radius and thickness of wall in m, shear modulus in Pa."""

    length: float
    radius: float
    wall_thickness: float
    modulus: float

    @property
    def bore(self) -> float:
        """Inner diameter at rest in m."""
        return 2.0 * (self.radius - self.wall_thickness)

    @property
    def wall(self) -> float:
        """Volume of the elastomer in m³."""
        return math.pi * (self.radius**2 - (self.radius - self.wall_thickness) ** 2) * self.length


@dataclass(frozen=True, slots=True, kw_only=True)
class Make:
    """The keys that all makes share, units in their names."""

    rest_length_mm: float
    outer_diameter_mm: float
    wall_mm: float
    shear_modulus_kPa: float
    friction_fraction: float = 0.0
    settle_ms: float = 0.0
    max_pressure_kPa: float
    rated_cycles: int | None = None

    @property
    def radius_mm(self) -> float:
        """Outer radius at rest in mm."""
        return self.outer_diameter_mm / 2.0

    def tube(self) -> dict[str, float]:
        """The fields of its `Tube`, in SI."""
        return {
            "length": self.rest_length_mm * 1e-3,
            "radius": self.radius_mm * 1e-3,
            "wall_thickness": self.wall_mm * 1e-3,
            "modulus": self.shear_modulus_kPa * 1e3,
        }

    def wall_problems(self) -> list[tuple[str, str, str]]:
        """A wall that leaves no bore, as (key, found, expected); empty where there is one."""
        radius = self.radius_mm
        if self.wall_mm >= radius:
            found = f"a wall of {self.wall_mm:g} mm leaves no bore in a tube of {self.outer_diameter_mm:g} mm"
            return [("wall_mm", found, f"less than {radius:g} mm")]
        return []
