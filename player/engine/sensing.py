"""What boards sense, held against what was wanted: the largest error, alarms, and the trim where it is asked for."""

import numpy as np
from numpy.typing import NDArray

from composer.drive.inverse import is_valve_drive, standing
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from player.engine.alarms import ALARMS, SLACK_S, Raised, Watch
from player.engine.errors import Errors
from player.engine.standing import Standing
from player.engine.trim import SLACK_S as TRIM_SLACK_S
from player.engine.trim import Trim
from player.outputs.base import Event

Array = NDArray[np.float64]


POINTS = 33
"""Points of the model's curve by which the trim finds set-points."""


class Sensing:
    """One for a run; `trim` is None unless set-points are to be corrected; `last`: (F,) strain as last sensed, or 0.
    `sensed`: (F,) the same, nan where nothing has been sensed.

    newest_s: when each driver's board has last sensed strain; supply_kPa: of each driver whose board has a sensor of it
    """

    def __init__(self, rig: Rig, abilities: Abilities, trims: bool = False):
        self.errors = Errors(len(rig.fibers))
        fastest = np.maximum(abilities.fill.max(axis=1), abilities.exhaust.max(axis=1))[abilities.which] / abilities.stroke
        self.watch = Watch(fastest)
        self.standing = Standing(len(rig.fibers))
        self.trim = Trim(standing(rig, abilities, POINTS), ~is_valve_drive(rig)) if trims else None
        self._names = [fiber.name for fiber in rig.fibers]
        self._drivers = [fiber.driver for fiber in rig.fibers]
        self._stroke = abilities.stroke
        self._least_kPa = rig.supply.min_pressure_kPa
        self._low: set[str] = set()
        self.supply_kPa: dict[str, float] = {}
        self.newest_s: dict[str, float] = {}
        self.last = np.zeros(len(rig.fibers))
        self.sensed = np.full(len(rig.fibers), np.nan)

    def sense(self, event: Event, watched: bool) -> list[tuple[Raised, str, str]]:
        """What an event shows: new alarms, each with the driver and the sentence. Only the largest error unless `watched`."""
        if event.kind == "supply":
            self.supply_kPa[event.driver] = event.kPa
            return self._supply(event) if watched else []
        self.last[event.fibers] = self.sensed[event.fibers] = event.strain
        self.newest_s[event.driver] = event.time_s
        self.errors.sense(event.time_s, event.fibers, event.strain)
        looks = watched and self.watch.due(event.time_s, event.fibers)
        zone = self.errors.around(event.time_s, SLACK_S, event.fibers) if looks else None
        if zone is None:
            return []
        stroke = self._stroke[event.fibers]
        share, low, high = event.strain / stroke, zone[0] / stroke, zone[1] / stroke
        found = self.watch.look(event.time_s, event.fibers, share, low, high)
        self.standing.sense(event.fibers, share, low, high, self.watch.alarmed)
        if self.trim is not None:
            near = self.errors.around(event.time_s, TRIM_SLACK_S, event.fibers) or zone
            self.trim.sense(event.time_s, event.fibers, share, near[0] / stroke, near[1] / stroke, self.watch.alarmed)
        if not found:
            return []
        where = {fiber: number for number, fiber in enumerate(event.fibers.tolist())}
        return [(one, self._drivers[one.fiber], self._said(one, share[where[one.fiber]], low, high, where)) for one in found]

    def begin_again(self) -> None:
        """Forget what was sensed before a fault: `last` (F,) is 0 until something is sensed anew."""
        self.watch.forget()
        self._low.clear()
        self.last[:] = 0.0
        self.sensed[:] = np.nan

    def applied(self, command: Array, strain: Array) -> Array:
        """The command (F,) that asks for strains (F,) with the trim, where there is one."""
        return command if self.trim is None else self.trim.applied(command, strain / self._stroke)

    def _said(self, one: Raised, share: float, low: Array, high: Array, where: dict[int, int]) -> str:
        row, number = ALARMS[one.name], where[one.fiber]
        least, most = f"{100 * low[number]:.0f}", f"{100 * high[number]:.0f}"
        wanted = f"{most} %" if least == most else f"{least} to {most} %"
        return (
            f"{self._names[one.fiber]} {row.says}: sensed at {100 * share:.0f} % of its stroke, wanted at {wanted}; {row.hint}"
        )

    def _supply(self, event: Event) -> list[tuple[Raised, str, str]]:
        if event.kPa >= self._least_kPa or event.driver in self._low:
            return []
        self._low.add(event.driver)
        row = ALARMS["supply"]
        say = f"{event.driver}: {row.says}: {event.kPa:.0f} kPa, at least {self._least_kPa:.0f}; {row.hint}"
        return [(Raised("supply", -1), event.driver, say)]
