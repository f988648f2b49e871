"""What followers of every kind of clock share: moments in order, what has happened since, and a source that falls silent."""

from collections.abc import Callable

from player.inputs.beat import Steady
from player.inputs.turns import Turn

MOST_TURNS = 256
"""Turns kept until they are asked for."""


class Follower:
    """A clock that is followed. `state` is one of `player.inputs.turns.STATES`; `backwards` counts wrong moments."""

    def __init__(self, steady: Steady, coast_s: float):
        """coast_s: for how long the last tempo is kept up when nothing comes any more."""
        self.state = "waiting"
        self.backwards = 0
        self._coast_s = coast_s
        self._steady = steady
        self._last_s: float | None = None
        self._held = 0.0
        self._turns: list[Turn] = []

    def turns(self) -> tuple[Turn, ...]:
        """What has happened since they were last asked for."""
        told = tuple(self._turns)
        self._turns.clear()
        return told

    def _tell(self, kind: str, place: float, at_s: float, say: str) -> None:
        if len(self._turns) < MOST_TURNS:
            self._turns.append(Turn(kind, place, at_s, say))

    def _in_order(self, at_s: float) -> float:
        """The moment of a message, that of the one before where it lies earlier."""
        if self._last_s is None or at_s >= self._last_s:
            return at_s
        self.backwards += 1
        return self._last_s

    def _falls_silent(self, now_s: float, after_s: float, place_at: Callable[[float], float], coast: str, hold: str) -> None:
        """Coast on once nothing has come for `after_s`, and stand once it has been coasted for long enough.

        coast, hold: what the operator is told, with {quiet:.1f} for the seconds of silence
        """
        if self.state not in ("running", "coasting") or self._last_s is None:
            return
        quiet_s = now_s - self._last_s
        if quiet_s <= after_s:
            return
        if self.state == "running":
            place = place_at(now_s)
            self.state = "coasting"
            self._tell("coast", place, now_s, coast.format(quiet=quiet_s))
        if quiet_s > self._coast_s:
            self._held = place_at(self._last_s + self._coast_s)
            self.state = "holding"
            self._tell("hold", self._held, now_s, hold.format(quiet=quiet_s))
