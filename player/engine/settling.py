"""How boards end a run: told to disarm at rest, or to vent, and heard to say so; what is done where one does not."""

from collections.abc import Callable, Sequence

from player.engine.asked import Asked
from player.engine.boards import Boards
from player.engine.clock import Clock
from player.engine.sensing import Sensing
from player.outputs.base import Event

SLICE_S = 0.005
"""The engine looks for what the operator asks at least this often, however slow the ticks are."""

STOPS_NOW = frozenset(("vent", "stop"))
LAST_SENSE_S = 0.12
"""After the last set boards are heard so long, until they have sensed where it has brought their fibers."""

SETTLE_S = 1.3
"""Seconds that a board has to say that it has disarmed: on a disturbed line it may have to be told three times."""


class Settling:
    """The end of a run at its boards.

    state: the safety state of the engine; tend: keeps links and front ends heard; hear: takes what boards tell
    fault: keeps a fault, by driver, words and meaning; stop: ends the run: how, why, by which event
    become: the transition of an event
    """

    def __init__(
        self,
        boards: Boards,
        sensing: Sensing,
        clock: Clock,
        asked: Asked,
        *,
        state: Callable[[], str],
        tend: Callable[[], None],
        hear: Callable[[Sequence[Event]], None],
        fault: Callable[[str, str, str], None],
        stop: Callable[[str, str, str], None],
        become: Callable[[str], None],
    ):
        self._boards, self._sensing, self._clock, self._asked = boards, sensing, clock, asked
        self._state, self._tend, self._hear, self._fault, self._stop, self._become = state, tend, hear, fault, stop, become

    def disarm(self, over_s: float) -> None:
        """All wants are at rest: once the last set has been due, tell every board to rest and disarm, and hear it say so.

        over_s: when the last set will have been carried out, on the clock
        """
        self._clock.wait_until(over_s)
        # How the last landing went is sensed a little later.
        while self._boards.sensing(self._sensing.newest_s, over_s) and self._clock.now() < over_s + LAST_SENSE_S:
            if self._asked.has(STOPS_NOW):
                break
            self._clock.wait_until(self._clock.now() + SLICE_S)
            self._tend()
        self._hear(self._boards.rest(0.0))
        if self._settles("idle"):
            if self._boards.vented:
                # One that has vented by itself is disarmed, but not at rest: what stands is what is worse.
                self._become("vent")
        elif self._state() != "vented":
            silent = self._boards.unsettled("idle")
            for driver in silent:
                self._fault(driver, f"{driver}: the board did not say that it has disarmed; it is told to vent", "note")
            self._stop("fault", f"{', '.join(silent)}: the board did not say that it has disarmed", "vent")

    def vent(self) -> None:
        """Tell every board to vent, all of them before any is waited for; then hear them say that they have."""
        self._hear(self._boards.vent())
        if not self._settles("vented"):
            for driver in self._boards.unsettled("vented"):
                self._fault(driver, f"{driver}: the board did not say that it has vented; shut its supply by hand", "note")

    def _settles(self, status: str) -> bool:
        """Hear the boards until all are in that state; False where they are not within SETTLE_S, or were vented meanwhile."""
        until = self._clock.now() + SETTLE_S
        while not self._boards.settled(status) and self._clock.now() < until:
            self._clock.wait_until(self._clock.now() + SLICE_S)
            self._tend()
            if status == "idle" and self._asked.has(STOPS_NOW):
                self._asked.take()
                self._stop("vented", "vented by the operator", "vent")
            if status == "idle" and self._state() == "vented":
                return False
        return self._boards.settled(status)
