"""How modelled fibers move: valve and tube, gas in the fiber, dry friction, lag; all fibers of a rig at once.

A step is explicit in the flow, which changes slowly, and exact in what is stiff: pressure stops at the set-point and at the
supply, strain at the edge of the friction band. So it is stable at any tick; below LONGEST_S it is accurate too.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber import charts
from composer.fiber.charts import Charts, look_up
from composer.fiber.gas import free_litres
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.simulate.moved import Moved

Array = NDArray[np.float64]
Index = NDArray[np.int64]

LONGEST_S = 2.5e-3
"""The longest step that is taken at once; a longer tick is cut into equal parts no longer than this."""

NEAR = 1e-9
"""Strain by which a wanted strain must differ from what there is before a strain drive opens its valve."""


@dataclass(frozen=True, slots=True, eq=False)
class Blown(Moved):
    """Modelled fibers after a step: also gauge `pressure` in Pa and `played`, the strain after friction and before the lag.

    rows: what the charts say at this pressure, kept for the next step; None where no chart goes by it
    """

    pressure: Array
    played: Array
    rows: Array | None = None


@dataclass(frozen=True, slots=True, eq=False)
class ModelledFibers:
    """M modelled fibers; arrays (M,). `drive` is 0 pressure, 1 strain, 2 valve; `full` Pa gauge that a set-point of 1 means.

    begins: (M,) the first row of each fiber's charts; reach: (M,) the strain of their last row by strain
    """

    charts: Charts
    begins: Index
    reach: Array
    stroke: Array
    full: Array
    settle: Array
    drive: NDArray[np.int8]
    any_strain: bool
    any_valve: bool
    indifferent_kPa: float

    def at(self, strain: Array) -> Blown:
        """Fibers at such strains (M,), blown up to them from below and settled."""
        holds = self._by_strain(strain)
        pressure = np.where(strain > 0.0, holds[:, charts.HOLDS_IN], 0.0)
        strain = np.array(strain, dtype=float)
        return Blown(strain, pressure / 1e3, 0.0, pressure, strain, self._by_pressure(pressure))

    def after(self, was: Moved, dt_s: float, command: Array, supply_kPa: float) -> Blown:
        """The fibers after `dt_s` of a constant command (M,), in drive units, with such a pressure in the receiver."""
        parts = parts_of(dt_s)
        now, drawn = was, 0.0
        for _ in range(parts):
            now = self._part(now, dt_s / parts, command, min(supply_kPa * 1e3, self.charts.supply))
            drawn += now.drawn_L
        return now if parts == 1 else Blown(now.strain, now.pressure_kPa, drawn, now.pressure, now.played, now.rows)

    def _by_strain(self, strain: Array) -> Array:
        """Chart rows (M, 3) at strains."""
        return look_up(self.charts.by_strain, self.begins, strain / self.reach)

    def _by_pressure(self, pressure: Array) -> Array:
        """Chart rows at pressures."""
        return look_up(self.charts.by_pressure, self.begins, pressure / self.charts.supply)

    def _part(self, was: Blown, h: float, command: Array, supply: float) -> Blown:
        pressure, played = was.pressure, was.played
        edge_in, edge_out, room = self._by_strain(played).T
        goal, opening = self._goal(command, played, pressure, edge_in, edge_out, supply)
        filling = goal > pressure
        # On the way to the edge of the friction band the fiber stands still, and its gas takes less for a rise in pressure.
        edge = np.where(filling, np.maximum(edge_in, pressure), np.minimum(edge_out, pressure))
        still = np.abs(edge - pressure) * room
        flow, takes = self._flow(was.rows, filling, opening, supply)
        middle = self._rise(pressure, filling, flow * (h / 2.0), still, room, takes, goal)
        flow, takes = self._flow(self._by_pressure(middle), filling, opening, supply)
        pressure_now = self._rise(pressure, filling, flow * h, still, room, takes, goal)
        ends = self._by_pressure(pressure_now)
        now = np.minimum(np.maximum(played, ends[:, charts.IN]), ends[:, charts.OUT])
        drawn = np.maximum(self._mass(pressure, pressure_now, edge, room, takes), 0.0).sum()
        return Blown(
            settled(self.settle, was.strain, played, now, h),
            pressure_now / 1e3,
            float(free_litres(drawn)),
            pressure_now,
            now,
            ends,
        )

    def _flow(self, rows: Array, filling: NDArray[np.bool_], opening: Array | None, supply: float) -> tuple[Array, Array]:
        """Mass flow in kg/s, in or out, by chart rows at a pressure, and the mass a Pa that the moving fiber takes."""
        rows = rows.T
        level = supply / self.charts.supply * (charts.SUPPLIES - 1)
        below = min(int(level), charts.SUPPLIES - 2)
        low, high = rows[charts.ENTERS + below], rows[charts.ENTERS + below + 1]
        flow = np.where(filling, low + (level - below) * (high - low), rows[charts.LEAVES])
        takes = np.where(filling, rows[charts.TAKES_IN], rows[charts.TAKES_OUT])
        return flow if opening is None else flow * opening, takes

    def _goal(
        self, command: Array, played: Array, pressure: Array, edge_in: Array, edge_out: Array, supply: float
    ) -> tuple[Array, Array | None]:
        """The pressure that each drive goes for, and how far its valve opens to get there (None: all fully)."""
        share = np.minimum(np.maximum(command, 0.0), 1.0)
        goal, opening = share * self.full, None
        if self.any_strain:
            wanted = share * self.stroke
            holds = self._by_strain(wanted)
            sought = np.where(wanted > played + NEAR, holds[:, 0], np.where(wanted < played - NEAR, holds[:, 1], pressure))
            sought = np.where(wanted <= 0.0, np.minimum(holds[:, 1], sought), sought)
            goal = np.where(self.drive == 1, np.minimum(sought, self.full), goal)
        if self.any_valve:
            by_valve = self.drive == 2
            opening = np.where(by_valve, np.minimum(np.abs(command), 1.0), 1.0)
            full = np.where(command > 0.0, self.full, np.where(command < 0.0, 0.0, pressure))
            goal = np.where(by_valve, full, goal)
        # What is above the supply never leaves through the filling valve: it holds.
        return np.where(goal > pressure, np.maximum(np.minimum(goal, supply), pressure), goal), opening

    @staticmethod
    def _rise(
        pressure: Array, filling: NDArray[np.bool_], mass: Array, still: Array, room: Array, takes: Array, goal: Array
    ) -> Array:
        """The pressure after so much mass, in or out: first to the edge at rest, the remainder while moving, no further than
        the goal."""
        at_rest = np.minimum(mass, still)
        change = at_rest / room + (mass - at_rest) / takes
        return np.where(filling, np.minimum(pressure + change, goal), np.maximum(pressure - change, goal))

    @staticmethod
    def _mass(pressure: Array, now: Array, edge: Array, room: Array, takes: Array) -> Array:
        """The mass in kg that went in for a rise from `pressure` to `now` past `edge`; negative where it fell."""
        to_edge = np.minimum(np.maximum(now, np.minimum(pressure, edge)), np.maximum(pressure, edge)) - pressure
        return to_edge * room + (now - pressure - to_edge) * takes


def parts_of(dt_s: float) -> int:
    """The number of equal steps, none longer than LONGEST_S, that a tick is cut into."""
    return max(1, int(np.ceil(dt_s / LONGEST_S - 1e-9)))


def settled(settle: Array, strain: Array, before: Array, now: Array, h: float) -> Array:
    """The lag of elastomer and braid (Kelvin and Voigt), `settle` in s: exact for a straight way from `before` to `now`."""
    lags = settle > 0.0
    tau = np.where(lags, settle, 1.0)
    behind = tau * (now - before) / h
    return np.where(lags, now - behind + (strain - before + behind) * np.exp(-h / tau), now)


def modelled_fibers(rig: Rig, abilities: Abilities, members: Index) -> ModelledFibers:
    """The modelled fibers among a rig's fibers, by their indices."""
    supply = rig.supply.pressure_kPa * 1e3
    makes, which = np.unique(abilities.which[members], return_inverse=True)
    physics = [abilities.capabilities[make].physics for make in makes]
    drives = [("pressure", "strain", "valve").index(rig.fibers[m].mounting.valve.drive) for m in members]
    made = charts.charts_of(physics, supply)
    return ModelledFibers(
        charts=made,
        begins=which * charts.POINTS,
        reach=made.reach[which],
        stroke=abilities.stroke[members],
        full=np.array([each.limit for each in physics])[which],
        settle=np.array([each.settle for each in physics])[which],
        drive=np.array(drives, dtype=np.int8),
        any_strain=1 in drives,
        any_valve=2 in drives,
        indifferent_kPa=rig.supply.pressure_kPa,
    )
