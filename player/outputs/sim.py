"""`sim`: the simulated rig in the player's own process; it moves as its fibers would, and senses every one of them."""

import math

import numpy as np

from composer.drive.inverse import vented
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.simulate.rig import SimulatedRig
from player.outputs.base import Array, Event, LinkLost, Mark, fibers_of

SETTLE_STEP_S, SETTLE_S = 0.02, 30.0
"""After the last set the rig is let settle in steps of this long, for at most so long, in no time of the player's."""

SUPPLY_S = 0.1
"""Between two readings of the simulated receiver."""

AT_REST = 1e-4
"""Strain below which a fiber that has been let go counts as at rest."""


class Sim:
    """A simulated rig. Each set is held until the next is due, whatever the player's own clock does meanwhile."""

    must_arm = False
    queue_sets = 0

    def __init__(self, rig: Rig, abilities: Abilities, drivers: tuple[str, ...]):
        self.target, self.drivers = "sim", drivers
        self._fibers = fibers_of(rig, drivers)
        self._sim = SimulatedRig(rig, abilities)
        self._vented = vented(rig)
        self._now_s: float | None = None
        self._command = np.zeros(len(rig.fibers))
        self._state = "idle"
        self._events: list[Event] = []
        self._sets = 0
        self._lowest_kPa = self._sim.supply_kPa
        self._supply_s = -math.inf

    def open(self) -> None:
        """Nothing to take hold of."""

    def preflight(self, rate_Hz: float) -> tuple[Mark, ...]:
        """A simulated rig is always there."""
        return (Mark(f"{'+'.join(self.drivers)}: the simulated rig is there", True, f"{len(self._fibers)} fibers"),)

    def arm(self) -> None:
        """All fibers at rest, ready to move."""
        self._sim.reset()
        self._state = "armed"

    def send(self, due_s: float, command: Array) -> None:
        """Move on to `due_s` by what was sent before, sense, and hold `command` from there on."""
        if self._now_s is not None and due_s > self._now_s:
            self._sim.step(due_s - self._now_s, self._command)
            self._lowest_kPa = min(self._lowest_kPa, self._sim.supply_kPa)
            sensed = self._sim.strain[self._fibers]
            self._events.append(Event("sense", self.drivers[0], time_s=due_s, fibers=self._fibers, strain=sensed))
            if due_s >= self._supply_s + SUPPLY_S:
                self._supply_s = due_s
                self._events.append(Event("supply", self.drivers[0], time_s=due_s, kPa=self._sim.supply_kPa))
        self._now_s = due_s
        self._command[self._fibers] = command[self._fibers]
        self._sets += 1

    def rest(self, over_s: float) -> None:
        """Hold the last set for the time asked, then let all go to rest."""
        if over_s > 0.0:
            self._sim.step(over_s, self._command)
        self._let_go("idle")

    def vent(self) -> None:
        """Let all air out."""
        self._let_go("vented")

    def poll(self) -> list[Event]:
        """What has been sensed since."""
        events, self._events = self._events, []
        return events

    def reattach(self) -> str:
        """It has no line that could be plugged in again."""
        raise LinkLost(f"{self.target} cannot be taken hold of again")

    def counters(self) -> dict[str, float]:
        """Sets taken, the lowest supply, the strain that is left at the end."""
        return {
            "sets": self._sets,
            "lowest_supply_kPa": round(self._lowest_kPa, 3),
            "strain_left": float(np.max(self._sim.strain[self._fibers], initial=0.0)),
        }

    def close(self) -> None:
        """Nothing to let go of."""

    def _let_go(self, state: str) -> None:
        self._command = self._vented.copy()
        for _ in range(round(SETTLE_S / SETTLE_STEP_S)):
            self._sim.step(SETTLE_STEP_S, self._command)
            if np.max(self._sim.strain, initial=0.0) < AT_REST:
                break
        self._state = state
