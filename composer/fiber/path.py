"""The way of the air between supply, fiber and outside: valve, tube and the fiber's own bore in series."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber import pipe as tubes
from composer.fiber.gas import R_AIR, RHO_ANR, T_ANR, air_viscosity
from composer.fiber.orifice import Orifice, upstream_pressure
from composer.fiber.pipe import Pipe, friction_factor

Array = NDArray[np.float64]

HALVINGS = 54
"""Bisection steps for the flow: to the last digits of a double."""


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
    return _flow(
        lambda flow: upstream_pressure(path.valve, flow, _through(path.pipes[::-1], flow, fiber, path.T), path.T),
        path,
        supply,
        fiber,
    )


def exhaust_flow(path: Path, fiber: Array, ambient: Array | float) -> Array:
    """Mass flow in kg/s from a fiber to the outside, absolute pressures in Pa, valve fully open; 0 where fiber is the lower."""
    return _flow(
        lambda flow: _through(path.pipes, flow, upstream_pressure(path.valve, flow, ambient, path.T), path.T),
        path,
        fiber,
        ambient,
    )


def _through(pipes: tuple[Pipe, ...], flow: Array, after: Array, T: float) -> Array:
    """Pressure before the last of these tubes, the first of them at the outlet."""
    for pipe in pipes:
        after = pressure_before(pipe, flow, after, T)
    return after


def _flow(needs: Callable[[Array], Array], path: Path, high: Array, low: Array) -> Array:
    """The flow for which `needs`, the pressure at the inlet that drives a flow to the outlet, is the one that is there."""
    high, low = np.broadcast_arrays(np.asarray(high, float), np.asarray(low, float))
    # Bisection on the flow, not on a pressure between: a wide valve's drop would be lost in the last digits.
    least, most = np.zeros(high.shape), path.valve.C * RHO_ANR * np.sqrt(T_ANR / path.T) * high
    for _ in range(HALVINGS):
        middle = 0.5 * (least + most)
        more = needs(middle) < high
        least, most = np.where(more, middle, least), np.where(more, most, middle)
    return np.where(high > low, 0.5 * (least + most), 0.0)
