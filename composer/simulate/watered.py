"""How modelled fibers move with water: it gives nothing, so strain moves at the flow over V'(e), all fibers at once.

The valve is open until the strain that its set-point holds; pressure follows from strain, and within the friction band,
where nothing moves, it is that of the set-point.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber import rates
from composer.fiber.charts import POINTS, Chart, chart_of, look_up, reach_of
from composer.fiber.orifice import water_area, water_flow
from composer.fiber.pipe import water_resistance
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.simulate.modelled import Blown, parts_of, settled
from composer.simulate.moved import Moved

Array = NDArray[np.float64]
Index = NDArray[np.int64]

HOLDS_IN, HOLDS_OUT, SWELL = range(3)
"""Columns by strain: pressure that holds it on the way in and out (Pa), volume for a strain of 1 (m³)."""


@dataclass(frozen=True, slots=True, eq=False)
class WateredFibers:
    """M modelled fibers full of water; arrays (M,). `drive` is 0 pressure, 1 strain, 2 valve.

    by_strain: charts from strain 0 to `reach` (M,); by_pressure: of strain on the way in and out, from 0 to `top` Pa gauge
    begins: (M,) the first row of each fiber's charts
    full: Pa gauge that a set-point of 1 means; area: m² of valve; resistance: Pa s/m³ of tubes
    """

    by_strain: Chart
    by_pressure: Chart
    begins: Index
    reach: Array
    top: float
    stroke: Array
    full: Array
    settle: Array
    drive: NDArray[np.int8]
    area: Array
    resistance: Array
    indifferent_kPa: float

    def at(self, strain: Array) -> Blown:
        """Fibers at such strains (M,), blown up to them from below and settled."""
        strain = np.array(strain, dtype=float)
        pressure = np.where(strain > 0.0, self._row(strain)[:, HOLDS_IN], 0.0)
        return Blown(strain, pressure / 1e3, 0.0, pressure, strain)

    def after(self, was: Moved, dt_s: float, command: Array, supply_kPa: float) -> Blown:
        """The fibers after `dt_s` of a constant command (M,), in drive units, with such a pressure at the pump."""
        parts = parts_of(dt_s)
        now, drawn = was, 0.0
        for _ in range(parts):
            now = self._part(now, dt_s / parts, command, min(supply_kPa * 1e3, self.top))
            drawn += now.drawn_L
        return Blown(now.strain, now.pressure_kPa, drawn, now.pressure, now.played)

    def _row(self, strain: Array) -> Array:
        return look_up(self.by_strain, self.begins, strain / self.reach)

    def _strains(self, pressure: Array) -> Array:
        """Strains (M, 2) that a pressure holds on the way in and out."""
        return look_up(self.by_pressure, self.begins, pressure / self.top)

    def _part(self, was: Blown, h: float, command: Array, supply: float) -> Blown:
        played = was.played
        goal, opening = self._goal(command, played, supply)
        now = self._moved(played, goal, opening, h / 2.0, supply, played)
        now = self._moved(played, goal, opening, h, supply, (played + now) / 2.0)
        holds = self._row(now)
        wanted = np.where(self.drive == 0, np.minimum(np.clip(command, 0.0, 1.0) * self.full, supply), was.pressure)
        # At rest the pressure is what the driver asks for, or what was shut in, within the band that friction holds.
        still = np.clip(wanted, holds[:, HOLDS_OUT], holds[:, HOLDS_IN])
        pressure = np.where(now > played, holds[:, HOLDS_IN], np.where(now < played, holds[:, HOLDS_OUT], still))
        pressure = np.where((now <= 0.0) & (self.drive != 2), np.minimum(wanted, holds[:, HOLDS_IN]), pressure)
        swell = self._row((played + now) / 2.0)[:, SWELL]
        drawn_L = float(np.maximum(now - played, 0.0) @ swell) * 1e3
        return Blown(settled(self.settle, was.strain, played, now, h), pressure / 1e3, drawn_L, pressure, now)

    def _goal(self, command: Array, played: Array, supply: float) -> tuple[Array, Array]:
        """The strain that each drive goes for, and how far its valve opens to get there."""
        way_in, way_out = self._strains(np.minimum(np.clip(command, 0.0, 1.0) * self.full, supply)).T
        goal = np.where(way_in > played, way_in, np.minimum(way_out, played))
        # No drive blows a fiber beyond what full pressure, or the pump, holds.
        most = np.maximum(self._strains(np.minimum(self.full, supply))[:, 0], played)
        by_strain = np.minimum(np.clip(command, 0.0, 1.0) * self.stroke, most)
        by_valve = np.where(command > 0.0, most, np.where(command < 0.0, 0.0, played))
        goal = np.choose(self.drive, [goal, by_strain, by_valve])
        return goal, np.where(self.drive == 2, np.minimum(np.abs(command), 1.0), 1.0)

    def _moved(self, played: Array, goal: Array, opening: Array, h: float, supply: float, at: Array) -> Array:
        """The strain after `h` at the rate that holds `at`, no further than the goal."""
        row = self._row(at)
        drop = np.where(goal > played, supply - row[:, HOLDS_IN], -row[:, HOLDS_OUT])
        drop = np.where(goal > played, np.maximum(drop, 0.0), np.minimum(drop, 0.0))
        reached = played + water_flow(self.area, self.resistance, drop) * opening / row[:, SWELL] * h
        return np.where(goal > played, np.minimum(reached, goal), np.maximum(reached, goal))


def watered_fibers(rig: Rig, abilities: Abilities, members: Index) -> WateredFibers:
    """The modelled fibers of a rig fed with water, by their indices."""
    top = rig.supply.pressure_kPa * 1e3
    makes, which = np.unique(abilities.which[members], return_inverse=True)
    physics = [abilities.capabilities[make].physics for make in makes]
    by_strain, by_pressure = [], []
    for each in physics:
        strain = np.linspace(0.0, reach_of(each), POINTS)
        holds_in, holds_out = rates.pressures(each, strain)
        by_strain.append(np.column_stack([holds_in, holds_out, each.count * each.shape.volume_slope(strain)]))
        fine = np.linspace(0.0, reach_of(each), 8 * POINTS)
        pressure = np.linspace(0.0, top, POINTS)
        by_pressure.append(np.column_stack([np.interp(pressure, holds, fine) for holds in rates.pressures(each, fine)]))
    drives = [("pressure", "strain", "valve").index(rig.fibers[m].mounting.valve.drive) for m in members]
    resistance = [sum(water_resistance(pipe) for pipe in each.path.pipes) for each in physics]
    return WateredFibers(
        by_strain=chart_of(by_strain),
        by_pressure=chart_of(by_pressure),
        begins=which * POINTS,
        reach=np.array([reach_of(each) for each in physics])[which],
        top=top,
        stroke=abilities.stroke[members],
        full=np.array([each.limit for each in physics])[which],
        settle=np.array([each.settle for each in physics])[which],
        drive=np.array(drives, dtype=np.int8),
        area=np.array([water_area(each.path.valve) for each in physics])[which],
        resistance=np.array(resistance)[which],
        indifferent_kPa=rig.supply.pressure_kPa,
    )
