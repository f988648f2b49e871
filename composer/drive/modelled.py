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
    """M modelled fibers, arrays (M,): `limit` Pa gauge that a set-point of 1 means, `settle` in s, `drive` 0 pressure,
    1 strain, 2 valve. With `leads` false nothing is led and friction is left out: the plain static curve."""

    charts: Charts
    which: Index
    stroke: Array
    limit: Array
    settle: Array
    drive: NDArray[np.int8]
    leads: bool

    def at(self, strain: Array) -> Told:
        """What is remembered of fibers that stand at strains (M,), blown up to them."""
        pressure = self._holds(strain)[:, charts.HOLDS_IN]
        return Told((strain > STILL).astype(float), strain, np.where(strain > STILL, pressure, 0.0))

    def commands(self, told: Told, strain: Array, soon: Array, ahead: Array, tick_s: float) -> tuple[Array, Told]:
        """What to send over ticks that are to end at `strain` (M, T), in drive units, and what to remember.

        soon: (M, T) strain wanted one lag later, ahead: (M, T) some way later; both are `strain` where nobody knows.
        The lag is led by settle times rate, but no further than the score itself goes within it, since friction would keep
        what went too far; a fiber that stands still sets out one lag early, as no valve gives it a leading jump.
        """
        step = np.diff(strain, axis=1, prepend=told.strain[:, None])
        side, played = self._side(told, step, ahead - strain), strain
        if self.leads:
            led = np.where(np.abs(step) > STILL, strain + step * (self.settle / tick_s)[:, None], soon)
            played = np.clip(led, np.minimum(strain, soon), np.maximum(strain, soon))
        played = np.clip(played, 0.0, self.stroke[:, None])
        holds = self._holds(played)
        # At rest with no move to come, a fiber is vented whole and not just to the edge where it stops moving.
        out = np.where(played > STILL, holds[..., charts.HOLDS_OUT], 0.0)
        goal = out + (side if self.leads else 0.5) * (holds[..., charts.HOLDS_IN] - out)
        goal = np.where(self.leads | (played > STILL), goal, 0.0)
        sent = np.where(
            (self.drive == 1)[:, None], played / self.stroke[:, None], np.clip(goal / self.limit[:, None], 0.0, 1.0)
        )
        pressure = goal[:, -1]
        by_valve = self.drive == 2
        if by_valve.any():
            opening, pressure = self._openings(told, goal, strain, tick_s)
            sent = np.where(by_valve[:, None], opening, sent)
        return sent, Told(side[:, -1], strain[:, -1].copy(), pressure)

    def _holds(self, strain: Array) -> Array:
        """Chart rows (..., 3) of strains (M, ...): pressures in Pa that hold them on the way in and out, and the room."""
        which = np.broadcast_to(self.which.reshape(-1, *[1] * (strain.ndim - 1)), strain.shape)
        share = strain / self.charts.reach[which]
        return look_up(self.charts.by_strain, charts.POINTS * which.ravel(), share.ravel()).reshape(*strain.shape, 3)

    @staticmethod
    def _side(told: Told, step: Array, coming: Array) -> Array:
        """The edge (M, T) of the band to be on: of the move under way, else of the next in sight, else where it was."""
        way = np.where(np.abs(step) > STILL, step, coming)
        known = np.abs(way) > STILL
        latest = np.maximum.accumulate(np.where(known, np.arange(way.shape[1]), -1), axis=1)
        side = np.take_along_axis((way > 0.0).astype(float), np.maximum(latest, 0), axis=1)
        return np.where(latest >= 0, side, told.side[:, None])

    def _openings(self, told: Told, goal: Array, strain: Array, tick_s: float) -> tuple[Array, Array]:
        """Signed openings (M, T) that take the pressure to each goal in its tick as far as it goes, and where it ends (M,)."""
        opening = np.empty_like(goal)
        pressure, before = told.pressure, told.strain
        for tick in range(goal.shape[1]):
            opening[:, tick], pressure = self._opening(pressure, goal[:, tick], before, tick_s)
            before = strain[:, tick]
        return opening, pressure

    def _opening(self, pressure: Array, goal: Array, strain: Array, tick_s: float) -> tuple[Array, Array]:
        row = look_up(self.charts.by_pressure, charts.POINTS * self.which, 0.5 * (pressure + goal) / self.charts.supply)
        edges = self._holds(strain)
        filling = goal > pressure
        edge = np.where(filling, edges[:, charts.HOLDS_IN], edges[:, charts.HOLDS_OUT])
        still = np.clip(edge, np.minimum(pressure, goal), np.maximum(pressure, goal)) - pressure
        takes = np.where(filling, row[:, charts.TAKES_IN], row[:, charts.TAKES_OUT])
        mass = still * edges[:, charts.ROOM] + (goal - pressure - still) * takes
        most = tick_s * np.where(filling, row[:, charts.ENTERS + charts.SUPPLIES - 1], row[:, charts.LEAVES])
        enough = most > np.abs(mass)
        opening = np.divide(mass, most, out=np.sign(mass), where=enough)
        share = np.divide(most, np.abs(mass), out=np.ones_like(mass), where=~enough & (mass != 0.0))
        return opening, pressure + share * (goal - pressure)


def modelled_inverse(rig: Rig, abilities: Abilities, members: Index, leads: bool) -> ModelledInverse:
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
        leads=leads,
    )
