"""Rated fibers: stroke and rates straight from a bench or a maker's sheet, the same at every strain."""

from dataclasses import dataclass

import numpy as np

from composer.fiber.capability import Capability
from composer.fiber.mounting import Mounting
from composer.keys import Key

KEYS = (
    Key("direction", "choice", "whether it shortens or lengthens when filled", choices=("contract", "extend")),
    Key("rest_length_mm", "number", "length at rest", unit="mm", low=1.0, high=1e5),
    Key("stroke", "number", "strain at full", unit="1", low=0.0, above=True, high=10.0),
    Key("fill_rate_per_s", "number", "fastest strain rate away from rest", unit="1/s", low=0.0, above=True, high=1e3),
    Key("exhaust_rate_per_s", "number", "fastest strain rate back to rest", unit="1/s", low=0.0, above=True, high=1e3),
    Key("air_mL", "number", "free air (ANR) for one full stroke", unit="mL", low=0.0, high=1e6),
    Key("accel_per_s2", "number", "greatest strain acceleration", unit="1/s²", low=0.0, above=True, high=1e6, default=None),
    Key("max_pressure_kPa", "number", "never blown harder than this, gauge", "kPa", 0.0, 2000.0, above=True, default=None),
    Key("rated_cycles", "integer", "strokes that it is rated for", low=1, high=10**12, default=None),
)


@dataclass(frozen=True, slots=True)
class Rated:
    """The keys of a rated fiber type, units in their names."""

    direction: str
    rest_length_mm: float
    stroke: float
    fill_rate_per_s: float
    exhaust_rate_per_s: float
    air_mL: float
    accel_per_s2: float | None = None
    max_pressure_kPa: float | None = None
    rated_cycles: int | None = None


def capability(make: Rated, mounting: Mounting) -> Capability:
    """The capability of a rated fiber: constant rates, air in proportion to strain, `bundle` times the air of one."""
    strain = np.array([0.0, make.stroke])
    return Capability(
        stroke=make.stroke,
        direction=make.direction,
        length_mm=make.rest_length_mm * mounting.series,
        turn_deg=None,
        strain=strain,
        fill=np.full(2, make.fill_rate_per_s),
        exhaust=np.full(2, make.exhaust_rate_per_s),
        accel=float("inf") if make.accel_per_s2 is None else make.accel_per_s2,
        air_L=strain / make.stroke * make.air_mL * 1e-3 * mounting.bundle * mounting.series,
        force_N=None,
    )
