"""What a fiber can do where it hangs, in the one form that every limit, the retimer and the player read."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber.rates import Physics

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Capability:
    """Stroke, fastest rates by strain and air by strain of one make as mounted; shared by all like fibers.

    stroke: usable strain (1), direction: "contract" or "extend"
    length_mm: the length that strain is a share of, `series` fibers end to end
    turn_deg: degrees of bend for a strain of 1, None for a fiber that stays straight
    strain: (n,) from 0 to stroke, rising; the rates between its points are linear in strain
    fill, exhaust: (n,) fastest strain rates in 1/s, both positive, away from rest and back
    accel: greatest strain acceleration in 1/s², inf where there is no such limit
    air_L: (n,) litres of free air (ANR) drawn in filling from rest to each strain, all of a bundle together
    force_N: force at rest at full pressure net of friction, None for a rated fiber
    held_below, held_above: strains below (above) which the exhaust (fill) rate was held at its value there
    physics: what a modelled fiber moves by, None for a rated one
    """

    stroke: float
    direction: str
    length_mm: float
    turn_deg: float | None
    strain: Array
    fill: Array
    exhaust: Array
    accel: float
    air_L: Array
    force_N: float | None
    held_below: float = 0.0
    held_above: float = float("inf")
    physics: Physics | None = None
