"""The simulated rig: valves, fibers of every kind, and the receiver they share, a step at a time."""

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.drive.inverse import members_by_kind
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.simulate import rated, receiver
from composer.simulate.moved import Moved, Simulated
from composer.simulate.response import Response

Array = NDArray[np.float64]
Index = NDArray[np.int64]

KINDS: dict[str, Callable[[Rig, Abilities, Index], Simulated]] = {"rated": rated.rated_fibers}
"""How fibers of each kind move: a further kind is one file beside this one and one row here."""

HALVINGS = 40
"""Halvings in search of the supply that a step ends with: enough to leave no more than rounding."""


class SimulatedRig:
    """A rig that moves as its fibers would.

    strain (F,), pressure_kPa (F,) gauge (nan for rated fibers), supply_kPa gauge in the receiver; drawn_L and delivered_L
    are the litres of free air that fibers took and the compressor gave since the start.
    """

    def __init__(self, rig: Rig, abilities: Abilities):
        self._supply = rig.supply
        members = members_by_kind(rig)
        self._members: list[Index] = list(members.values())
        self._kinds = [KINDS[kind](rig, abilities, which) for kind, which in members.items()]
        self._indifferent_kPa = max((kind.indifferent_kPa for kind in self._kinds), default=0.0)
        self._fibers = len(rig.fibers)
        delay = np.array([fiber.mounting.valve.switch_ms * 1e-3 for fiber in rig.fibers])
        # At rest a set-point is 0 and a valve is shut, which is 0 too.
        self._response = Response(delay, np.zeros(self._fibers))
        self.reset()

    def reset(self, strain: ArrayLike | None = None) -> None:
        """Begin again: every fiber at rest, or at `strain` (F,), the receiver full, nothing on its way to a valve."""
        begin = np.zeros(self._fibers) if strain is None else np.asarray(strain, dtype=float)
        self._response.reset()
        self._receiver = receiver.full(self._supply)
        self._show([kind.at(begin[which]) for kind, which in zip(self._kinds, self._members, strict=True)])

    def step(self, dt_s: float, command: ArrayLike) -> None:
        """Let `dt_s` seconds pass with `command` (F,) sent: pressure and strain drives 0 to 1, valve drives -1 to 1.

        What is sent takes effect after each valve's response, to the instant; a value out of range is taken as the nearest.
        """
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
            low, high = 0.0, max(self._receiver.supply_kPa, ends.supply_kPa, self._indifferent_kPa)
            for _ in range(HALVINGS):
                middle = (low + high) / 2
                moved, ends = attempt(middle)
                low, high = (middle, high) if ends.supply_kPa > middle else (low, middle)
            moved, ends = attempt(low)
        self._receiver = ends
        self._show(moved)

    def _show(self, moved: list[Moved]) -> None:
        self._moved = moved
        self.strain, self.pressure_kPa = np.empty(self._fibers), np.empty(self._fibers)
        for which, kind in zip(self._members, moved, strict=True):
            self.strain[which], self.pressure_kPa[which] = kind.strain, kind.pressure_kPa
