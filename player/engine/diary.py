"""What the engine writes into the log of its run; without a log, nothing."""

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from player.engine.clock import Clock
from player.engine.run_log import FULL, RunLog
from player.outputs.base import Event
from player.wire.values import clip, is_valve, to_wire

Array = NDArray[np.float64]


class Diary:
    """Every happening of a run as a record, with its place in the score.

    stroke: (F,) usable strokes; drives: (F,) of the fibers; drivers: the boards' names, in the rig's order
    """

    def __init__(self, clock: Clock, stroke: Array, drives: Sequence[str], drivers: Sequence[str]):
        self._log: RunLog | None = None
        self._say_place: Callable[[float], str] = lambda position_s: f"{position_s:.1f}s"
        self._clock, self._stroke, self._valve = clock, stroke, is_valve(tuple(drives))
        self._driver = {name: number for number, name in enumerate(drivers)}
        self._supply: dict[str, float] = {}

    def keep(self, log: RunLog | None, say_place: Callable[[float], str] | None = None) -> None:
        """From here on all that happens goes into this log."""
        self._log, self._say_place = log, say_place or self._say_place

    @property
    def broken(self) -> str:
        """Why the log could not be written any further, "" where it could."""
        if self._log is None or not self._log.broken:
            return ""
        return f"{self._log.broken}; make room on its disk, or keep the log on another"

    def tell(self, kind: str, position_s: float, /, **told: Any) -> None:
        """A record with a JSON body, and the place in the score."""
        if self._log is not None:
            place = self._say_place(position_s)
            self._log.tell(kind, self._clock.now(), **told, place=place, position_s=round(position_s, 6))

    def set(self, due_s: float, late_s: float, position_s: float, command: Array, strain: Array | None) -> None:
        """A set that has been sent."""
        if self._log is None:
            return
        sent = to_wire(clip(command, self._valve)[0], self._valve)
        wanted = None if strain is None else np.rint(np.clip(strain / self._stroke, 0.0, 1.0) * FULL).astype(np.uint16)
        self._log.set(self._clock.now(), due_s, late_s, position_s, sent, wanted)

    def event(self, event: Event, position_s: float) -> None:
        """What a board told."""
        if self._log is None:
            return
        if event.kind == "sense":
            self._log.sense(self._clock.now(), event.time_s, event.fibers, event.strain / self._stroke[event.fibers])
        elif event.kind == "supply":
            if self._supply.get(event.driver) != event.kPa:
                self._supply[event.driver] = event.kPa
                self._log.supply(self._clock.now(), self._driver.get(event.driver, 0), event.kPa)
        elif event.kind != "state" or event.say:
            told = {"driver": event.driver, "kind": event.kind, "say": event.say, "code": event.code, "status": event.status}
            self.tell("board", position_s, **told)
