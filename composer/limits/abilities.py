"""What all fibers of a rig can do, stacked into arrays: the one thing that checker, retimer, simulator and governor read."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber.capability import Capability
from composer.fiber.kinds import KINDS
from composer.rig.model import Rig

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Abilities:
    """F fibers that share A distinct capabilities.

    which: (F,) the capability of each fiber
    stroke, accel, length_mm, turn_deg, max_hold_s: (F,) by fiber; strain (1), 1/s², mm, degrees per strain (nan: stays
        straight), s (inf: no limit)
    strain, fill, exhaust, air_L: (A, n) rate tables: strain points, fastest rates in 1/s, free air drawn from rest in L
    """

    capabilities: tuple[Capability, ...]
    which: NDArray[np.int64]
    stroke: Array
    accel: Array
    length_mm: Array
    turn_deg: Array
    max_hold_s: Array
    strain: Array
    fill: Array
    exhaust: Array
    air_L: Array

    @property
    def constant(self) -> NDArray[np.bool_]:
        """(A,) whether a capability's rates are the same at every strain, so that closed forms hold."""
        return np.ptp(self.fill, axis=1) + np.ptp(self.exhaust, axis=1) == 0.0


def abilities_of(rig: Rig) -> Abilities:
    """The abilities of a rig's fibers; like fibers (same make, valve, tube, load) share one capability, computed once."""
    seen: dict[object, int] = {}
    capabilities: list[Capability] = []
    which = np.empty(len(rig.fibers), dtype=np.int64)
    for index, fiber in enumerate(rig.fibers):
        alike = (fiber.type.name, fiber.mounting)
        if alike not in seen:
            seen[alike] = len(capabilities)
            capabilities.append(KINDS[fiber.type.kind].capability(fiber.type.make, fiber.mounting))
        which[index] = seen[alike]
    points = max((len(c.strain) for c in capabilities), default=2)
    strain = np.array([_points(c, points) for c in capabilities]).reshape(-1, points)

    def column(values: str) -> Array:
        return np.array(
            [np.interp(g, c.strain, getattr(c, values)) for g, c in zip(strain, capabilities, strict=True)]
        ).reshape(-1, points)

    def by_fiber(values: list[float]) -> Array:
        return np.array(values, dtype=float)[which] if values else np.empty(0)

    holds = np.array([fiber.max_hold_s for fiber in rig.fibers], dtype=float)
    return Abilities(
        capabilities=tuple(capabilities),
        which=which,
        stroke=by_fiber([c.stroke for c in capabilities]),
        accel=by_fiber([c.accel for c in capabilities]),
        length_mm=by_fiber([c.length_mm for c in capabilities]),
        turn_deg=by_fiber([np.nan if c.turn_deg is None else c.turn_deg for c in capabilities]),
        max_hold_s=np.where(holds > 0.0, holds, np.inf),
        strain=strain,
        fill=column("fill"),
        exhaust=column("exhaust"),
        air_L=column("air_L"),
    )


def _points(capability: Capability, points: int) -> Array:
    """The capability's own strains, or as many as `points` where it has fewer (a rated one has two)."""
    if len(capability.strain) == points:
        return capability.strain
    return np.linspace(0.0, capability.stroke, points)
