"""The simulated rig: valves, fibers of every kind, and the receiver they share, a step at a time."""

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.simulate import modelled, rated, receiver, watered
from composer.simulate.moved import Moved, Simulated
from composer.simulate.response import Response

Array = NDArray[np.float64]
Index = NDArray[np.int64]

LAWS: dict[str, Callable[[Rig, Abilities, Index], Simulated]] = {
    "rated": rated.rated_fibers,
    "air": modelled.modelled_fibers,
    "water": watered.watered_fibers,
}
"""How fibers move, rated ones and modelled ones by what fills them: a further law is one file beside this one and one row."""

SAME_KPA = 1e-6
"""Supplies closer than this are one."""

MOST_TRIES = 60
"""Tries in search of the supply that a step ends with; most find it in five."""

Attempt = Callable[[float], tuple[list[Moved], receiver.Receiver]]


class SimulatedRig:
    """A rig that moves as its fibers would.

    strain (F,), pressure_kPa (F,) gauge (nan for rated fibers), supply_kPa gauge in the receiver; drawn_L and delivered_L
    are the litres of free air that fibers took and the compressor gave since the start. averages: whether a step takes the
    mean of what its valves do, rather than their turns one by one.
    """

    def __init__(self, rig: Rig, abilities: Abilities):
        self._supply = rig.supply
        physics = [abilities.capabilities[which].physics for which in abilities.which]
        law = np.array(["rated" if each is None else rig.supply.medium for each in physics], dtype=object)
        members: dict[str, Index] = {name: np.flatnonzero(law == name) for name in dict.fromkeys(law)}
        self._members = list(members.values())
        self._kinds = [LAWS[name](rig, abilities, which) for name, which in members.items()]
        self._indifferent_kPa = max((kind.indifferent_kPa for kind in self._kinds), default=0.0)
        self._fibers = len(rig.fibers)
        # A rating says what valve, tube and fiber do together; a modelled fiber's tube comes on top of its valve.
        tube = np.array([0.0 if each is None else each.delay for each in physics])
        delay = tube + np.array([fiber.mounting.valve.switch_ms * 1e-3 for fiber in rig.fibers])
        # At rest a set-point is 0 and a valve is shut, which is 0 too.
        self._response = Response(delay, np.zeros(self._fibers))
        # Every tube has a delay of its own. For gas the mean of what a valve does in a tick is as good as its turns, and
        # a rig of many delays is not cut into as many steps; a rated fiber is exact only if the turns are.
        self.averages = any(each is not None for each in physics)
        self.reset()

    def reset(self, strain: ArrayLike | None = None) -> None:
        """Begin again: every fiber at rest, or at `strain` (F,), the receiver full, nothing on its way to a valve."""
        begin = np.zeros(self._fibers) if strain is None else np.asarray(strain, dtype=float)
        self._response.reset()
        self._receiver = receiver.full(self._supply)
        self._show([kind.at(begin[which]) for kind, which in zip(self._kinds, self._members, strict=True)])

    def step(self, dt_s: float, command: ArrayLike) -> None:
        """Let `dt_s` seconds pass with `command` (F,) sent: pressure and strain drives 0 to 1, valve drives -1 to 1.

        What is sent takes effect after each valve's response, to the instant (where a fiber is modelled, as the mean over
        the step); a value out of range is taken as the nearest.
        """
        if self.averages:
            self._advance(dt_s, self._response.mean(dt_s, np.asarray(command, dtype=float)))
            return
        for lasts, in_force in self._response.hold(dt_s, np.asarray(command, dtype=float)):
            self._advance(lasts, in_force)

    @property
    def supply_kPa(self) -> float:
        """The receiver's pressure, gauge."""
        return self._receiver.supply_kPa

    @property
    def drawn_L(self) -> float:
        """Free air drawn by the fibers since the start, in L."""
        return self._receiver.drawn_L

    @property
    def delivered_L(self) -> float:
        """Free air delivered by the compressor since the start, in L."""
        return self._receiver.delivered_L

    def _advance(self, dt_s: float, command: Array) -> None:
        each = [command[which] for which in self._members]

        def attempt(supply_kPa: float) -> tuple[list[Moved], receiver.Receiver]:
            moved = [
                kind.after(was, dt_s, sent, supply_kPa) for kind, was, sent in zip(self._kinds, self._moved, each, strict=True)
            ]
            return moved, receiver.after(self._receiver, self._supply, dt_s, sum(kind.drawn_L for kind in moved))

        moved, ends = attempt(self.supply_kPa)
        if min(ends.supply_kPa, self.supply_kPa) < self._indifferent_kPa:
            # Short of air: the step is taken with the supply that it ends with (implicit), which falls the less the
            # lower it is, so that there is one answer, never below empty, for a receiver of any size and any tick.
            moved, ends = self._in_short_supply(attempt, ends.supply_kPa)
        self._receiver = ends
        self._show(moved)

    def _in_short_supply(self, attempt: Attempt, end_kPa: float) -> tuple[list[Moved], receiver.Receiver]:
        """The step whose supply is the one that it ends with, to SAME_KPA: by false position, after Illinois.

        Always the side on which it ends with no less than it was taken with, so that a receiver is never below empty.
        """
        low, high = 0.0, max(self._receiver.supply_kPa, end_kPa, self._indifferent_kPa)
        best, highest = attempt(low), attempt(high)
        above = apart = best[1].supply_kPa
        below = highest[1].supply_kPa - high
        if below >= -SAME_KPA:
            return highest
        for _ in range(MOST_TRIES):
            if apart <= SAME_KPA or high - low <= SAME_KPA:
                break
            supply = (low * below - high * above) / (below - above)
            tried = attempt(supply)
            over = tried[1].supply_kPa - supply
            if over >= 0.0:
                # The end that stays counts half, which keeps the search from crawling up on one side.
                low, best, apart, above, below = supply, tried, over, over, below / 2.0
            else:
                high, below, above = supply, over, above / 2.0
        return best

    def _show(self, moved: list[Moved]) -> None:
        self._moved = moved
        self.strain, self.pressure_kPa = np.empty(self._fibers), np.empty(self._fibers)
        for which, kind in zip(self._members, moved, strict=True):
            self.strain[which], self.pressure_kPa[which] = kind.strain, kind.pressure_kPa
