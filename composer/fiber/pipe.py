"""Tubes: isothermal compressible flow with friction, reduced to what a given pair of pressures lets through."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber.gas import MU_WATER, R_AIR, T_ANR, air_viscosity, speed_of_sound

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Pipe:
    """A smooth tube of circular bore; bore and length in m; `parallel` such tubes side by side share the flow."""

    bore: float
    length: float
    parallel: int = 1

    @property
    def area(self) -> float:
        """Cross-section in m² of one."""
        return np.pi / 4.0 * self.bore**2

    @property
    def volume(self) -> float:
        """Dead volume in m³ of all."""
        return self.area * self.length * self.parallel


def delay(pipe: Pipe, T: float = T_ANR) -> float:
    """Seconds that a pressure step needs to run through the tube: length over the speed of sound."""
    return pipe.length / speed_of_sound(T)


def friction_factor(reynolds: Array) -> Array:
    """Darcy friction factor of a smooth pipe over all regimes (Churchill 1977); 64/Re where the flow is laminar."""
    re = np.maximum(reynolds, 1e-9)
    a = (2.457 * np.log(np.maximum((re / 7.0) ** 0.9, 1.0 + 1e-12))) ** 16
    b = (37530.0 / re) ** 16
    return 8.0 * ((8.0 / re) ** 12 + (a + b) ** -1.5) ** (1.0 / 12.0)


def isothermal_flow(pipe: Pipe, upstream: Array, downstream: Array, T: float = T_ANR) -> Array:
    """Mass flow in kg/s through a tube, absolute pressures in Pa, upstream the higher; any broadcastable shapes.

    Isothermal flow of an ideal gas with friction: m'² = A² (p1² − p2²) / (R T (f L/D + 2 ln(p1/p2))), the downstream
    pressure no lower than where the flow chokes. Solved for m' by fixed-point steps on f; exact for laminar flow, where it is
    Hagen and Poiseuille's law at the mean density.
    """
    p1, p2 = np.broadcast_arrays(np.asarray(upstream, float), np.asarray(downstream, float))
    if pipe.length <= 0.0:
        return np.full(p1.shape, np.inf)
    shape, p1, p2 = p1.shape, p1.ravel(), np.minimum(p2, p1).ravel()
    mu = air_viscosity(T)
    laminar = np.pi * pipe.bore**4 * (p1**2 - p2**2) / (256.0 * mu * pipe.length * R_AIR * T)
    flow = laminar
    per_flow = 4.0 / (np.pi * pipe.bore * mu)
    for _ in range(60):
        resistance = friction_factor(flow * per_flow) * pipe.length / pipe.bore
        low = np.maximum(p2, _choked(p1, resistance))
        log = 2.0 * np.log(p1 / np.maximum(low, 1.0))
        new = pipe.area * np.sqrt(np.maximum(p1**2 - low**2, 0.0) / (R_AIR * T * (resistance + log)))
        # Half steps in the logarithm: plain steps swing to and fro in laminar flow, where m' goes with 1/f.
        new = np.sqrt(np.maximum(new, 1e-300) * np.maximum(flow, 1e-300))
        if np.all(np.abs(new - flow) <= 1e-12 * (new + 1e-30)):
            break
        flow = new
    return pipe.parallel * np.where(p1 > p2, flow, 0.0).reshape(shape)


def _choked(p1: Array, resistance: Array) -> Array:
    """The outlet pressure in Pa below which isothermal flow passes no more: (p1/p2)² − 2 ln(p1/p2) − 1 = f L/D."""
    x = 1.0 + resistance + np.log1p(resistance)
    for _ in range(20):
        x = 1.0 + resistance + np.log(x)
    return p1 / np.sqrt(x)


def water_resistance(pipe: Pipe) -> float:
    """Pressure drop of a tube over its flow of water, in Pa s/m³: 128 mu L / (pi D⁴) (Hagen and Poiseuille)."""
    return 128.0 * MU_WATER * pipe.length / (np.pi * pipe.bore**4 * pipe.parallel)
