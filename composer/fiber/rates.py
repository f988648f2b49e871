"""Rate tables of modelled fibers: how fast a fiber can fill and exhaust at each strain, and the air that it draws."""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from composer.fiber.gas import R_AIR, RHO_ANR, SOUND_WATER
from composer.fiber.mounting import Supply
from composer.fiber.orifice import water_area, water_flow
from composer.fiber.path import Path, exhaust_flow, fill_flow
from composer.fiber.pipe import water_resistance
from composer.fiber.work import Kinematics, exhausting_pressure, filling_pressure

Array = NDArray[np.float64]

POINTS = 97
"""Strains in a table."""

FULL_SHARE = 0.95
"""Share of the worst supply at which a stroke is usable (rig-file.md)."""

HELD_SHARE = 0.02
"""Below this share of stroke the exhaust rate, and above one less it the fill rate, keeps its value there (physics.md)."""


@dataclass(frozen=True, slots=True)
class Physics:
    """A modelled fiber as mounted, in SI: one fiber's shape, its share of the load, and how many there are on the valve.

    load: N on each fiber; friction: share of ideal force; settle: s; count: bundle times series
    stop: strain at which the shape, or what holds it, ends the motion
    stroke: usable strain; full: gauge pressure in Pa that it is defined at; limit: the most it may ever have
    """

    shape: Kinematics
    path: Path
    load: float
    friction: float
    settle: float
    count: int
    stop: float
    stroke: float
    full: float
    limit: float
    n: float
    ambient: float
    water: bool

    @property
    def delay(self) -> float:
        """Seconds, whole milliseconds, that a change at the valve takes to the fiber at the speed of sound."""
        if self.water:
            return round(sum(pipe.length for pipe in self.path.pipes) / SOUND_WATER, 3)
        return round(self.path.delay, 3)


def worst_supply(supply: Supply) -> float:
    """The lowest gauge pressure in Pa that the fibers are promised for: regulator, or receiver where that is lower."""
    return min(supply.pressure_kPa, supply.min_pressure_kPa) * 1e3


def full_pressure(max_pressure_kPa: float, supply: Supply) -> float:
    """The gauge pressure in Pa at which a stroke is usable, for a fiber that may have so much."""
    return min(FULL_SHARE * worst_supply(supply), max_pressure_kPa * 1e3)


def pressures(physics: Physics, e: Array) -> tuple[Array, Array]:
    """Gauge pressures in Pa that hold strains `e` on the way in and on the way out."""
    return (
        filling_pressure(physics.shape, e, physics.load, physics.friction),
        exhausting_pressure(physics.shape, e, physics.load, physics.friction),
    )


def slopes(physics: Physics, e: Array) -> tuple[Array, Array]:
    """dP/de in Pa along both ways, by central differences inside the shape's range."""
    h = 1e-6 * max(physics.stop, 1e-3)
    low, high = np.maximum(e - h, 0.0), np.minimum(e + h, physics.stop)
    up, down = pressures(physics, high), pressures(physics, low)
    return (up[0] - down[0]) / (high - low), (up[1] - down[1]) / (high - low)


def gas_volume(physics: Physics, e: Array) -> Array:
    """Volume in m³ that gas fills, of all fibers on the valve and the tube to them."""
    return physics.count * (physics.shape.volume(e) - physics.shape.wall) + physics.path.dead_volume


def capacity(physics: Physics, e: Array, pressure: Array, slope: Array) -> Array:
    """Mass in kg that raises the pressure by one Pa while the fiber moves: (V + n P V' e'(P)) / (n R T); `pressure` gauge."""
    return _mass_by_strain(physics, e, pressure, slope) / slope


def fastest(physics: Physics, e: Array, supply: float) -> tuple[Array, Array]:
    """Fastest strain rates in 1/s at strains `e`, filling from `supply` Pa gauge and exhausting to the outside.

    rate = e'(P) dP/dt with the valve fully open at the pressure that holds e (physics.md).
    """
    p_in, p_out = pressures(physics, e)
    if physics.water:
        area = water_area(physics.path.valve)
        resistance = sum(water_resistance(pipe) for pipe in physics.path.pipes)
        swell = physics.count * physics.shape.volume_slope(e)
        return water_flow(area, resistance, supply - p_in) / swell, water_flow(area, resistance, p_out) / swell
    slope_in, slope_out = slopes(physics, e)
    flow_in = fill_flow(physics.path, np.full(e.shape, supply + physics.ambient), p_in + physics.ambient)
    flow_out = exhaust_flow(physics.path, p_out + physics.ambient, physics.ambient)
    return (
        flow_in / _mass_by_strain(physics, e, p_in, slope_in),
        flow_out / _mass_by_strain(physics, e, p_out, slope_out),
    )


def _mass_by_strain(physics: Physics, e: Array, pressure: Array, slope: Array) -> Array:
    """Mass in kg for a strain of 1, (V dP/de + n P V') / (n R T): `capacity` times dP/de, fit for a slope of nothing too."""
    swell = physics.count * physics.shape.volume_slope(e)
    absolute = pressure + physics.ambient
    return (gas_volume(physics, e) * slope + physics.n * absolute * swell) / (physics.n * R_AIR * physics.path.T)


def drawn(physics: Physics, e: Array) -> Array:
    """Litres of free air (of water) drawn in filling from rest, vented, to each of the rising strains `e`, the first 0.

    From the gas balance: dm = (V dP / n + P dV) / (R T). What brings a loaded fiber to the pressure at which it begins to move
    is drawn before it moves, and is counted by the second strain.
    """
    if physics.water:
        return physics.count * (physics.shape.volume(e) - physics.shape.volume(e[:1])) * 1e3
    fine = np.unique(np.concatenate([np.linspace(a, b, 17) for a, b in pairwise(e)]))
    p = pressures(physics, fine)[0] + physics.ambient
    v = gas_volume(physics, fine)
    middle_p, middle_v = 0.5 * (p[1:] + p[:-1]), 0.5 * (v[1:] + v[:-1])
    mass = (middle_v * np.diff(p) / physics.n + middle_p * np.diff(v)) / (R_AIR * physics.path.T)
    total = np.concatenate([[0.0], np.cumsum(mass)])
    first = v[0] * (p[0] - physics.ambient) / physics.n / (R_AIR * physics.path.T)
    litres = (np.interp(e, fine, total) + first) / RHO_ANR * 1e3
    return np.concatenate([[0.0], litres[1:]])
