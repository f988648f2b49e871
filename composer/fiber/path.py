"""The way of the air between supply, fiber and outside: valve, tube and the fiber's own bore in series."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber import pipe as tubes
from composer.fiber.gas import R_AIR, T_ANR, air_viscosity
from composer.fiber.orifice import Orifice, mass_flow
from composer.fiber.pipe import Pipe, friction_factor

Array = NDArray[np.float64]

HALVINGS = 60
"""Bisection steps for the pressure between valve and tube: to the last digit of a double."""


@dataclass(frozen=True, slots=True)
class Path:
    """A valve, then tubes in order from the valve to the fiber (the last is half the fiber's own bore)."""

    valve: Orifice
    pipes: tuple[Pipe, ...]
    T: float = T_ANR

    @property
    def dead_volume(self) -> float:
        """Volume in m³ of the tube, which fills along with the fiber; the fiber's own bore is counted by the fiber."""
        return self.pipes[0].volume if self.pipes else 0.0

    @property
    def delay(self) -> float:
        """Seconds that a change at the valve needs to reach the fiber."""
        return sum(tubes.delay(pipe, self.T) for pipe in self.pipes)


def pressure_before(pipe: Pipe, flow: Array, after: Array, T: float = T_ANR) -> Array:
    """Absolute pressure in Pa at a tube's inlet that drives a mass flow in kg/s out at `after` Pa.

    Isothermal flow with friction, as `composer.fiber.pipe.isothermal_flow` has it; where the outlet would be faster than
    isothermal flow can be (p2 < m' sqrt(R T) / A) the outlet pressure is that of choking.
    """
    if pipe.length <= 0.0:
        return np.maximum(after, 0.0)
    flow = flow / pipe.parallel
    flux = flow / pipe.area
    low = np.maximum(after, flux * np.sqrt(R_AIR * T))
    resistance = friction_factor(4.0 * flow / (np.pi * pipe.bore * air_viscosity(T))) * pipe.length / pipe.bore
    # x = (p1/p2)² solves x = 1 + share (f L/D + ln x); Newton's steps come down to it from above, share being at most 1.
    share = flux**2 * R_AIR * T / low**2
    x = (1.0 + share * resistance) / (1.0 - share / 2.0)
    for _ in range(8):
        x = x - (x - 1.0 - share * (resistance + np.log(x))) / np.maximum(1.0 - share / x, 1e-9)
    return low * np.sqrt(x)


def fill_flow(path: Path, supply: Array, fiber: Array) -> Array:
    """Mass flow in kg/s from a supply into a fiber, absolute pressures in Pa, valve fully open; 0 where supply is the lower."""

    def excess(middle: Array) -> Array:
        flow = np.maximum(mass_flow(path.valve, supply, middle, path.T), 0.0)
        before = fiber
        for pipe in reversed(path.pipes):
            before = pressure_before(pipe, flow, before, path.T)
        return before - middle

    supply, fiber = np.broadcast_arrays(np.asarray(supply, float), np.asarray(fiber, float))
    middle = _bisect(excess, fiber, np.maximum(supply, fiber))
    return np.where(supply > fiber, np.maximum(mass_flow(path.valve, supply, middle, path.T), 0.0), 0.0)


def exhaust_flow(path: Path, fiber: Array, ambient: Array | float) -> Array:
    """Mass flow in kg/s from a fiber to the outside, absolute pressures in Pa, valve fully open; 0 where fiber is the lower."""

    def excess(middle: Array) -> Array:
        flow = np.maximum(mass_flow(path.valve, middle, ambient, path.T), 0.0)
        before = middle
        for pipe in path.pipes:
            before = pressure_before(pipe, flow, before, path.T)
        return fiber - before

    fiber, ambient = np.broadcast_arrays(np.asarray(fiber, float), np.asarray(ambient, float))
    middle = _bisect(excess, ambient, np.maximum(fiber, ambient))
    return np.where(fiber > ambient, np.maximum(mass_flow(path.valve, middle, ambient, path.T), 0.0), 0.0)


def _bisect(falling: Callable[[Array], Array], low: Array, high: Array) -> Array:
    """The root of a falling function between two arrays of bounds, each element on its own."""
    low, high = low.copy(), high.copy()
    for _ in range(HALVINGS):
        middle = 0.5 * (low + high)
        right = falling(middle) > 0.0
        low, high = np.where(right, middle, low), np.where(right, high, middle)
    return 0.5 * (low + high)
