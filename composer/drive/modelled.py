"""What is sent to modelled fibers: the static inverse of the strain wanted, through friction and lag, for each drive.

Friction makes a band of pressures at every strain: the fiber stands still between the pressure that holds it on the way out
and the one on the way in. A fiber that is about to move is brought to the edge of the band on that side beforehand, where
nobody sees it, so that it leaves on time.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber import charts
from composer.fiber.charts import Charts, look_up
from composer.limits.abilities import Abilities
from composer.rig.model import Rig

Array = NDArray[np.float64]
Index = NDArray[np.int64]

LOOK_S = 0.25
"""How long before a move its fiber is brought to the edge of the friction band, in s."""

STILL = 1e-9
"""A change of strain by less than this is none."""


@dataclass(frozen=True, slots=True, eq=False)
class Told:
    """What is remembered of M fibers between ticks: `side` of the band (1 in, 0 out), `strain`, and gauge `pressure` in Pa."""

    side: Array
    strain: Array
    pressure: Array


@dataclass(frozen=True, slots=True, eq=False)
class ModelledInverse:
    """M modelled fibers, arrays (M,): `limit` Pa gauge that a set-point of 1 means, `settle` s, `drive` 0 pressure, 1 strain,
    2 valve."""

    charts: Charts
    which: Index
    stroke: Array
    limit: Array
    settle: Array
    drive: NDArray[np.int8]

    def at_rest(self) -> Told:
        """The memory of fibers at rest, vented."""
        nothing = np.zeros(len(self.which))
        return Told(nothing, nothing, nothing)

    def commands(self, told: Told, strain: Array, soon: Array, ahead: Array, tick_s: float) -> tuple[Array, Told]:
        """What to send over a tick that is to end at `strain` (M,), in drive units, and what to remember.

        soon: (M,) strain wanted one lag later, ahead: (M,) strain wanted LOOK_S later; both are `strain` where nobody knows.
        The lag is led by settle times rate, but no further than the score itself goes within it, since friction would keep
        what went too far.
        """
        step = strain - told.strain
        moving = np.abs(step) > STILL
        coming = np.where(moving, step, ahead - strain)
        side = np.where(coming > STILL, 1.0, np.where(coming < -STILL, 0.0, told.side))
        led = strain + np.where(moving, step, 0.0) * self.settle / tick_s
        low, high = np.minimum(strain, soon), np.maximum(strain, soon)
        played = np.clip(np.clip(led, low, high), 0.0, self.stroke)
        holds = look_up(self.charts.by_strain, self.which, played / self.charts.stroke[self.which])
        # At rest with no move to come, a fiber is vented whole and not just to the edge where it stops moving.
        out = np.where(played > STILL, holds[:, charts.HOLDS_OUT], 0.0)
        goal = out + side * (holds[:, charts.HOLDS_IN] - out)
        sent = np.where(self.drive == 1, played / self.stroke, np.clip(goal / self.limit, 0.0, 1.0))
        pressure = goal
        by_valve = self.drive == 2
        if by_valve.any():
            opening, reached = self._opening(told, goal, tick_s)
            sent, pressure = np.where(by_valve, opening, sent), np.where(by_valve, reached, goal)
        return sent, Told(side, strain, pressure)

    def _opening(self, told: Told, goal: Array, tick_s: float) -> tuple[Array, Array]:
        """The signed opening (M,) that takes the pressure from where it is to `goal` in a tick, and where it will be then."""
        row = look_up(self.charts.by_pressure, self.which, 0.5 * (told.pressure + goal) / self.charts.supply)
        edges = look_up(self.charts.by_strain, self.which, told.strain / self.charts.stroke[self.which])
        filling = goal > told.pressure
        edge = np.where(filling, edges[:, charts.HOLDS_IN], edges[:, charts.HOLDS_OUT])
        still = np.clip(edge, np.minimum(told.pressure, goal), np.maximum(told.pressure, goal)) - told.pressure
        takes = np.where(filling, row[:, charts.TAKES_IN], row[:, charts.TAKES_OUT])
        mass = still * row[:, charts.ROOM_IN] + (goal - told.pressure - still) * takes
        flow = np.where(filling, row[:, charts.ENTERS + charts.SUPPLIES - 1], row[:, charts.LEAVES])
        wide = np.divide(mass, flow * tick_s, out=np.sign(mass), where=flow * tick_s > np.abs(mass))
        share = np.divide(wide * flow * tick_s, mass, out=np.ones_like(mass), where=mass != 0.0)
        return wide, told.pressure + np.clip(share, 0.0, 1.0) * (goal - told.pressure)


def modelled_inverse(rig: Rig, abilities: Abilities, members: Index) -> ModelledInverse:
    """The inverse of the modelled fibers among a rig's fibers, by their indices."""
    makes, which = np.unique(abilities.which[members], return_inverse=True)
    physics = [abilities.capabilities[make].physics for make in makes]
    drives = [("pressure", "strain", "valve").index(rig.fibers[m].mounting.valve.drive) for m in members]
    return ModelledInverse(
        charts=charts.charts_of(physics, rig.supply.pressure_kPa * 1e3),
        which=which,
        stroke=abilities.stroke[members],
        limit=np.array([each.limit for each in physics])[which],
        settle=np.array([each.settle for each in physics])[which],
        drive=np.array(drives, dtype=np.int8),
    )


def modelled_lead(rig: Rig, abilities: Abilities, members: Index) -> Array:
    """Seconds (M,) by which commands run ahead: the valve's response and the way of the pressure through the tube."""
    return np.array(
        [
            rig.fibers[member].mounting.valve.switch_ms * 1e-3
            + abilities.capabilities[abilities.which[member]].physics.path.delay
            for member in members
        ]
    )
