"""Charts of modelled fibers: everything that a step needs, by pressure and by strain, looked up instead of solved.

Each distinct capability has one chart; the fibers that share it share its rows. Pressures are gauge in Pa.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from composer.fiber import rates
from composer.fiber.gas import R_AIR
from composer.fiber.path import exhaust_flow, fill_flow
from composer.fiber.rates import Physics

Array = NDArray[np.float64]

POINTS = 1024
"""Pressures, and strains, in a chart."""

SUPPLIES = 6
"""Supply pressures for which filling is charted, from none to the regulator's, evenly."""

IN, OUT, ROOM_IN, ROOM_OUT, TAKES_IN, TAKES_OUT, LEAVES, ENTERS = range(8)
"""Columns by pressure: strain on the way in and out (1); mass a Pa at rest there, at the strain of either way; mass a Pa
while moving in and out (kg/Pa); mass flow out (kg/s); from ENTERS on, mass flow in from each charted supply (kg/s)."""

HOLDS_IN, HOLDS_OUT = range(2)
"""Columns by strain: pressure that holds it on the way in and out (Pa)."""


SOLVED = 192
"""Pressures at which flows are solved; between them they are taken in a straight line."""


@dataclass(frozen=True, slots=True, eq=False)
class Charts:
    """A charts of one grid size: `by_pressure` (A, POINTS, 8 + SUPPLIES - 1), `by_strain` (A, POINTS, 2).

    top: (A,) the pressure of the last row in Pa; stroke: (A,) the strain of the last row
    supply: the regulator's gauge pressure in Pa
    """

    by_pressure: Array
    by_strain: Array
    top: Array
    stroke: Array
    supply: float


def charts_of(physics: list[Physics], supply: float) -> Charts:
    """The charts of these fibers, fed by a regulator at `supply` Pa gauge."""
    pressure = [_by_pressure(each, supply) for each in physics]
    strain = [_by_strain(each) for each in physics]
    return Charts(
        np.array(pressure),
        np.array(strain),
        np.full(len(physics), supply),
        np.array([reach_of(each) for each in physics]),
        supply,
    )


def look_up(table: Array, which: NDArray[np.int64], share: Array) -> Array:
    """Rows of charts (M, columns) at a share (M,), 0 to 1, of their last row, on the straight line between rows."""
    at = np.clip(share, 0.0, 1.0) * (table.shape[1] - 1)
    row = np.minimum(at.astype(np.int64), table.shape[1] - 2)
    part = (at - row)[:, None]
    flat = table.reshape(-1, table.shape[2])
    row += which * table.shape[1]
    low = flat.take(row, axis=0)
    return low + part * (flat.take(row + 1, axis=0) - low)


def reach_of(physics: Physics) -> float:
    """The strain at which the shape stops, just short of where a braid would need endless pressure."""
    return physics.stop * (1.0 - 1e-9)


def _by_strain(physics: Physics) -> Array:
    strain = np.linspace(0.0, reach_of(physics), POINTS)
    return np.column_stack(rates.pressures(physics, strain))


@lru_cache(maxsize=64)
def _by_pressure(physics: Physics, supply: float) -> Array:
    pressure = np.linspace(0.0, supply, POINTS)
    # Strain over pressure from pressure over strain, which rises: denser in strain than the chart is in pressure.
    strain = np.linspace(0.0, reach_of(physics), 8 * POINTS)
    holds_in, holds_out = rates.pressures(physics, strain)
    way_in, way_out = np.interp(pressure, holds_in, strain), np.interp(pressure, holds_out, strain)
    columns = np.empty((POINTS, ENTERS + SUPPLIES))
    columns[:, IN], columns[:, OUT] = way_in, way_out
    still = physics.n * R_AIR * physics.path.T
    for strains, holds, room, takes, slope_of in (
        (way_in, holds_in, ROOM_IN, TAKES_IN, 0),
        (way_out, holds_out, ROOM_OUT, TAKES_OUT, 1),
    ):
        columns[:, room] = rates.gas_volume(physics, strains) / still
        moves = (pressure >= holds[0]) & (pressure < holds[-1])
        slope = rates.slopes(physics, strains)[slope_of]
        columns[:, takes] = np.where(moves, rates.capacity(physics, strains, pressure, slope), columns[:, room])
    # Flows bend most where the pressures are nearly equal, so the solved ones lie closest together there.
    near = np.linspace(0.0, 1.0, SOLVED) ** 2
    columns[:, LEAVES] = np.interp(
        pressure, supply * near, exhaust_flow(physics.path, supply * near + physics.ambient, physics.ambient)
    )
    for number, level in enumerate(np.linspace(0.0, supply, SUPPLIES)):
        solved = level * (1.0 - near[::-1])
        flow = fill_flow(physics.path, np.full(SOLVED, level + physics.ambient), solved + physics.ambient)
        columns[:, ENTERS + number] = np.interp(pressure, solved, flow) * (pressure < level)
    return columns
