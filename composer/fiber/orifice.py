"""Restrictions to flow after ISO 6358 for air, and as a sharp orifice for water."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber.gas import RHO_ANR, RHO_WATER, T_ANR

Array = NDArray[np.float64]

NEARLY_EQUAL = 0.999
"""Pressure ratio above which the flow falls in a straight line to nothing, where the ellipse has no finite slope."""

CONDUCTANCE_PER_AREA = 1.9919e-3
"""Sonic conductance of a perfect nozzle, in m³/(s Pa) per m²: 0.19919 dm³/(s bar) for 1 mm², from isentropic flow."""


@dataclass(frozen=True, slots=True)
class Orifice:
    """A restriction to air flow after ISO 6358: sonic conductance C in m³/(s Pa), critical pressure ratio b."""

    C: float
    b: float


def orifice(C_dm3_s_bar: float, b: float) -> Orifice:
    """An orifice from the units of data sheets, dm³/(s bar)."""
    return Orifice(C_dm3_s_bar * 1e-8, b)


def throughput(ratio: Array, b: Array | float) -> Array:
    """Share of the choked flow that passes at a pressure ratio p2/p1 (ISO 6358-1:2013), any broadcastable shapes.

    1 up to b, an ellipse above it, a straight line to 0 from the ratio NEARLY_EQUAL on (further up where b itself lies
    that close to 1).
    """
    bend = np.maximum(NEARLY_EQUAL, 0.5 * (1.0 + np.asarray(b)))
    at_bend = np.sqrt(1.0 - ((bend - b) / (1.0 - b)) ** 2)
    over = np.clip((ratio - b) / (1.0 - b), 0.0, 1.0)
    return np.where(ratio < bend, np.sqrt(1.0 - over**2), at_bend * np.clip((1.0 - ratio) / (1.0 - bend), 0.0, 1.0))


def mass_flow(orifice: Orifice, upstream: Array, downstream: Array, T: float = T_ANR) -> Array:
    """Mass flow in kg/s from `upstream` to `downstream`, absolute pressures in Pa, any broadcastable shapes.

    C p1 rho0 sqrt(T0/T1) times `throughput` (ISO 6358-1:2013). Negative where downstream is the higher.
    """
    high, low = np.maximum(upstream, downstream), np.minimum(upstream, downstream)
    ratio = np.divide(low, high, out=np.ones(np.shape(high)), where=high > 0.0)
    flow = orifice.C * high * RHO_ANR * np.sqrt(T_ANR / T) * throughput(ratio, orifice.b)
    return np.where(np.asarray(upstream) >= downstream, flow, -flow)


def upstream_pressure(orifice: Orifice, flow: Array, downstream: Array, T: float = T_ANR) -> Array:
    """The absolute pressure in Pa that drives a mass flow in kg/s out at `downstream` Pa: the inverse of `mass_flow`."""
    b = orifice.b
    bend = max(NEARLY_EQUAL, 0.5 * (1.0 + b))
    at_bend = np.sqrt(1.0 - ((bend - b) / (1.0 - b)) ** 2)
    choked = flow / (orifice.C * RHO_ANR * np.sqrt(T_ANR / T))
    straight = downstream + choked * (1.0 - bend) / at_bend
    # On the ellipse (1 - 2b) p² + 2b p2 p = p2² + (1 - b)² (m'/C')²; the root in the form that holds for b of a half, too.
    right = downstream**2 + ((1.0 - b) * choked) ** 2
    under = np.maximum((b * downstream) ** 2 + (1.0 - 2.0 * b) * right, 0.0)
    ellipse = right / (b * downstream + np.sqrt(under))
    return np.where(downstream > bend * straight, straight, np.where(downstream <= b * choked, choked, ellipse))


def water_area(orifice: Orifice) -> float:
    """Effective area in m² of the same opening for water: the nozzle area that has this sonic conductance."""
    return orifice.C / CONDUCTANCE_PER_AREA


def water_flow(area: float, tube_resistance: float, drop: Array) -> Array:
    """Volume flow in m³/s of water through an orifice of `area` m² and a tube of `tube_resistance` Pa s/m³ in series.

    Orifice: drop = rho Q²/(2 area²); tube: drop = resistance Q (Hagen and Poiseuille). `drop` in Pa, its sign is the flow's.
    """
    a = RHO_WATER / (2.0 * area**2)
    size = np.abs(drop)
    # The root of a Q² + R Q = drop in the form that loses no digits where the tube governs.
    below = tube_resistance + np.sqrt(tube_resistance**2 + 4.0 * a * size)
    return np.sign(drop) * np.divide(2.0 * size, below, out=np.zeros(np.shape(below)), where=below > 0.0)
