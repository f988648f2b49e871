"""`file:PATH`: a recording of what would be sent to a rig's boards, in the format of `player.outputs.recording`."""

import os
from contextlib import AbstractContextManager, suppress
from typing import IO

import numpy as np
from numpy.typing import NDArray

from composer.faults import fault
from composer.files import check_writable, replacing
from composer.rig.model import Rig
from player.outputs import recording
from player.outputs.base import Array, Event, LinkLost, Mark, fibers_of
from player.wire.values import clip, is_valve, to_wire


class _NothingRecorded(Exception):
    """Leaves the target as it was."""


class File:
    """A recording under way; it takes its target's place once it is closed, and then holds all that was sent up to there."""

    must_arm = False
    queue_sets = 0

    def __init__(self, rig: Rig, drivers: tuple[str, ...], path: str, rate_Hz: float):
        self.target, self.drivers = f"file:{path}", drivers
        self._rig, self._path, self._rate_Hz = rig, path, rate_Hz
        self._fibers = fibers_of(rig, drivers)
        self._boards = tuple((driver.name, driver.channels) for driver in rig.drivers if driver.name in drivers)
        self._place = places_of(rig, self._boards)[self._fibers]
        self._valve = is_valve([rig.fibers[i].mounting.valve.drive for i in self._fibers])
        self._values = np.zeros(sum(channels for _, channels in self._boards), dtype=np.uint16)
        self._file: IO[bytes] | None = None
        self._taking_place: AbstractContextManager[IO[bytes]] | None = None
        self._began_s: float | None = None
        self._last_s = 0.0
        self._sets = 0
        self._bytes = 0

    def open(self) -> None:
        """See that the target can be written, and begin beside it."""
        if not self._path:
            raise fault("file:", "no path after 'file:'", "file:PATH, such as file:tonight.rec")
        check_writable(self._path)
        self._taking_place = replacing(self._path, "wb")
        self._file = self._taking_place.__enter__()
        rig_path = os.path.relpath(self._rig.file, os.path.dirname(os.path.abspath(self._path)))
        self._put(recording.head(self._rig.fingerprint, self._rate_Hz, self._boards, rig_path))

    def preflight(self, rate_Hz: float) -> tuple[Mark, ...]:
        """The file is open by now."""
        return (Mark(f"{'+'.join(self.drivers)}: {self._path} can be written", True),)

    def arm(self) -> None:
        """Nothing to arm."""

    def send(self, due_s: float, command: Array) -> None:
        """Record a set."""
        if self._began_s is None:
            self._began_s = due_s
        self._last_s = due_s - self._began_s
        self._values[self._place] = to_wire(clip(command[self._fibers], self._valve)[0], self._valve)
        self._put(recording.frame(recording.SET, self._last_s, self._values))
        self._sets += 1

    def rest(self, over_s: float) -> None:
        """Record that the boards were told to rest."""
        self._put(recording.frame(recording.REST, self._last_s))

    def vent(self) -> None:
        """Record that the boards were told to vent."""
        self._put(recording.frame(recording.VENT, self._last_s))

    def poll(self) -> list[Event]:
        """A file has nothing to tell."""
        return []

    def reattach(self) -> str:
        """It has no line that could be plugged in again."""
        raise LinkLost(f"{self.target} cannot be taken hold of again")

    def counters(self) -> dict[str, float]:
        """Sets and bytes written."""
        return {"sets": self._sets, "bytes": self._bytes}

    def close(self) -> None:
        """Complete the recording and let it take its place; where nothing was sent, leave no trace."""
        if self._taking_place is None:
            return
        taking_place, self._taking_place = self._taking_place, None
        if self._sets:
            self._put(recording.frame(recording.END, self._last_s))
            taking_place.__exit__(None, None, None)
        else:
            nothing = _NothingRecorded()
            with suppress(_NothingRecorded):
                taking_place.__exit__(type(nothing), nothing, None)
        self._file = None

    def _put(self, data: bytes) -> None:
        if self._file is None:
            raise LinkLost("the file is closed")
        try:
            self._file.write(data)
        except OSError as error:
            raise LinkLost(f"cannot write {self._path}: {error.strerror or error}") from None
        self._bytes += len(data)


def places_of(rig: Rig, boards: tuple[tuple[str, int], ...]) -> NDArray[np.int64]:
    """(F,) where each fiber's channel stands among the channels of these boards, one after another; -1 where it is on none."""
    first, at = {}, 0
    for name, channels in boards:
        first[name] = at
        at += channels
    return np.array(
        [first[fiber.driver] + fiber.channel if fiber.driver in first else -1 for fiber in rig.fibers], dtype=np.int64
    )
