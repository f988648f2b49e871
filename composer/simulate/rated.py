"""How a rated fiber moves: to its set-point no faster than its rates, filling more slowly where the supply falls short."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.drive.inverse import is_valve_drive
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.simulate import receiver
from composer.simulate.moved import Moved

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class RatedFibers:
    """M rated fibers of a rig, arrays (M,): strain 1, rates 1/s, air in litres of free air for a strain of 1.

    A rating says nothing of pressures, so the law of a short supply is the plainest that fits its ends: with the receiver
    at or above `indifferent_kPa` fibers fill at their rating, with an empty one not at all, in proportion between.
    An accel rating is a limit for the checker; here a fiber is at its rate at once.
    """

    stroke: Array
    fill: Array
    exhaust: Array
    air_L: Array
    by_valve: NDArray[np.bool_]
    any_valve: bool
    indifferent_kPa: float

    def at(self, strain: Array) -> Moved:
        """Fibers at such strains, nothing drawn."""
        return Moved(np.array(strain, dtype=float), np.full(len(self.stroke), np.nan), 0.0)

    def after(self, was: Moved, dt_s: float, command: Array, supply_kPa: float) -> Moved:
        """The fibers after `dt_s` of a constant `command` (M,) and `supply_kPa` in the receiver: exact for any `dt_s`."""
        if self.any_valve:
            goal = np.where(self.by_valve, command > 0.0, np.minimum(np.maximum(command, 0.0), 1.0)) * self.stroke
            seconds = np.where(self.by_valve, np.minimum(np.abs(command), 1.0), 1.0) * dt_s
        else:
            goal, seconds = np.minimum(np.maximum(command, 0.0), 1.0) * self.stroke, dt_s
        push = min(max(supply_kPa / self.indifferent_kPa, 0.0), 1.0)
        # Goals are compared before anything is added, so that a fiber within reach is at its goal to the last digit.
        highest, lowest = was.strain + self.fill * (push * seconds), was.strain - self.exhaust * seconds
        reached = np.minimum(np.maximum(goal, lowest), highest)
        drawn = self.air_L @ np.maximum(reached - was.strain, 0.0)
        return Moved(reached, was.pressure_kPa, float(drawn))


def rated_fibers(rig: Rig, abilities: Abilities, members: NDArray[np.int64]) -> RatedFibers:
    """The rated fibers among a rig's fibers, by their indices."""
    make = abilities.which[members]
    stroke = abilities.stroke[members]
    by_valve = is_valve_drive(rig)[members]
    return RatedFibers(
        stroke=stroke,
        fill=abilities.fill[make, 0],
        exhaust=abilities.exhaust[make, 0],
        air_L=abilities.air_L[make, -1] / stroke,
        by_valve=by_valve,
        any_valve=bool(by_valve.any()),
        indifferent_kPa=receiver.needed_kPa(rig.supply),
    )
