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

SOLVED = 192
"""Pressures at which flows are solved; between them they are taken in a straight line."""

IN, OUT, TAKES_IN, TAKES_OUT, LEAVES, ENTERS = range(6)
"""Columns by pressure: strain on the way in and out (1); mass a Pa while moving in and out (kg/Pa); mass flow out (kg/s); from
ENTERS on, mass flow in from each charted supply (kg/s)."""

HOLDS_IN, HOLDS_OUT, ROOM = range(3)
"""Columns by strain: pressure that holds it on the way in and out (Pa); mass a Pa while it stands still (kg/Pa)."""


@dataclass(frozen=True, slots=True, eq=False)
class Chart:
    """A tables of POINTS rows each, end to end: `rows` (A * POINTS, columns), `steps` from each to the next, 0 at ends."""

    rows: Array
    steps: Array


def chart_of(tables: list[Array]) -> Chart:
    """One chart of tables (POINTS, columns) each."""
    rows = np.array(tables)
    return Chart(rows.reshape(-1, rows.shape[2]), np.diff(rows, axis=1, append=rows[:, -1:]).reshape(-1, rows.shape[2]))


def look_up(chart: Chart, begins: NDArray[np.int64], share: Array) -> Array:
    """Rows (M, columns) at a share (M,), 0 to 1, of the table that begins at row `begins` (M,), straight between its rows."""
    at = np.minimum(np.maximum(share, 0.0), 1.0) * (POINTS - 1)
    row = at.astype(np.int64)
    part = at - row
    row += begins
    return chart.rows.take(row, axis=0) + part[:, None] * chart.steps.take(row, axis=0)


@dataclass(frozen=True, slots=True, eq=False)
class Charts:
    """Charts of A capabilities: `by_pressure` with ENTERS + SUPPLIES columns, `by_strain` with 3.

    supply: the regulator's gauge pressure in Pa, at the last row by pressure
    reach: (A,) the strain of the last row by strain
    """

    by_pressure: Chart
    by_strain: Chart
    reach: Array
    supply: float


def charts_of(physics: list[Physics], supply: float) -> Charts:
    """The charts of these fibers, fed by a regulator at `supply` Pa gauge."""
    return Charts(
        chart_of([_by_pressure(each, supply) for each in physics]),
        chart_of([_by_strain(each) for each in physics]),
        np.array([reach_of(each) for each in physics]),
        supply,
    )


def reach_of(physics: Physics) -> float:
    """The strain at which the shape stops, just short of where a braid would need endless pressure."""
    return physics.stop * (1.0 - 1e-9)


def _by_strain(physics: Physics) -> Array:
    strain = np.linspace(0.0, reach_of(physics), POINTS)
    return np.column_stack([*rates.pressures(physics, strain), _room(physics, strain)])


def _room(physics: Physics, strain: Array) -> Array:
    """Mass a Pa in kg of a fiber that stands still."""
    return rates.gas_volume(physics, strain) / (physics.n * R_AIR * physics.path.T)


@lru_cache(maxsize=64)
def _by_pressure(physics: Physics, supply: float) -> Array:
    pressure = np.linspace(0.0, supply, POINTS)
    # Strain over pressure from pressure over strain, which rises: denser in strain than the chart is in pressure.
    strain = np.linspace(0.0, reach_of(physics), 8 * POINTS)
    columns = np.empty((POINTS, ENTERS + SUPPLIES))
    for column, takes, holds, way in zip(
        (IN, OUT), (TAKES_IN, TAKES_OUT), rates.pressures(physics, strain), (0, 1), strict=True
    ):
        strains = columns[:, column] = np.interp(pressure, holds, strain)
        moves = (pressure >= holds[0]) & (pressure < holds[-1])
        takes_moving = rates.capacity(physics, strains, pressure, rates.slopes(physics, strains)[way])
        columns[:, takes] = np.where(moves, takes_moving, _room(physics, strains))
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
