"""One principle for every fiber: virtual work. P V'(e) = W'(e) + F L0, with dry friction taking its share.

A kind of fiber is its kinematics; everything here is the same for all of them. Strain e is positive in the fiber's own
direction, pressures are gauge in Pa, volumes in m³, energies in J, forces in N, lengths in m.
"""

from typing import Protocol

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

LEAST_SLOPE = 1e-12
"""Share of its volume at rest below which a fiber's dV/de counts as this."""


class Kinematics(Protocol):
    """What one fiber's shape does with strain."""

    length: float
    """Rest length in m."""
    bore: float
    """Inner diameter at rest in m."""
    stop: float
    """Strain at which the shape itself ends the motion."""
    wall: float
    """Volume of the elastomer in m³, which does not change."""

    def volume(self, e: Array) -> Array:
        """Enclosed volume in m³, wall included."""

    def volume_slope(self, e: Array) -> Array:
        """dV/de in m³."""

    def energy(self, e: Array) -> Array:
        """Elastic energy in J."""

    def energy_slope(self, e: Array) -> Array:
        """dW/de in J."""


def ideal_force(shape: Kinematics, e: Array, pressure: Array) -> Array:
    """Force in N along the axis at strain e and gauge pressure, without friction: (P V' − W') / L0."""
    return (pressure * shape.volume_slope(e) - shape.energy_slope(e)) / shape.length


def filling_pressure(shape: Kinematics, e: Array, load: float, friction: float) -> Array:
    """Gauge pressure in Pa that holds strain e on the way in: (1 − f) P V' = W' + F L0 (friction takes f of P V')."""
    return _needed(shape, e, load) / (1.0 - friction)


def exhausting_pressure(shape: Kinematics, e: Array, load: float, friction: float) -> Array:
    """Gauge pressure in Pa that holds strain e on the way out: (1 + f) P V' = W' + F L0."""
    return _needed(shape, e, load) / (1.0 + friction)


def _needed(shape: Kinematics, e: Array, load: float) -> Array:
    # At the very stop of a braid V' is nothing and at rest W' is, but for rounding: never a pressure without end, or below 0.
    slope = np.maximum(shape.volume_slope(e), LEAST_SLOPE * shape.volume(0.0))
    return (np.maximum(shape.energy_slope(e), 0.0) + load * shape.length) / slope


def reach(shape: Kinematics, pressure: float, load: float, friction: float) -> float:
    """Strain that filling to a gauge pressure in Pa reaches, no further than the shape's stop; 0 where it lifts nothing.

    The pressure that holds a strain rises with it for every kind, so plain bisection finds the strain to the last digit.
    """
    low, high = 0.0, shape.stop
    if filling_pressure(shape, np.array([0.0]), load, friction)[0] >= pressure:
        return 0.0
    if filling_pressure(shape, np.array([high]), load, friction)[0] <= pressure:
        return high
    for _ in range(80):
        middle = 0.5 * (low + high)
        if filling_pressure(shape, np.array([middle]), load, friction)[0] <= pressure:
            low = middle
        else:
            high = middle
    return low
