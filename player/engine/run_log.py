"""The log of a run: one append-only file, framed and checksummed, so that a run cut off at any byte can be read up to there.

Little-endian. The file begins with `MAGIC`; records as in `player.engine.framed`, their time that of the engine's monotonic
clock. Bodies:

    1 head      JSON: what is played, on which rig, to which targets, from which date; fiber names and drives in the rig's order
    2 state     JSON: {"was", "event", "state"}
    3 command   JSON: {"command", "value"}: what the operator or a signal asked for
    4 set       due_us:u64 late_us:u32 position_us:u64 value:u16 for every fiber, in the rig's order, as on the wire
    5 sense     at_us:u64 first:u16 strain:f32 for each fiber from `first` on, in the rig's order
    6 board     JSON: {"driver", "kind", "say", "code", "status"}: what a board told: states, faults, notes
    7 slip      JSON: {"seconds"}: the host stood still longer than sets were ahead; the score went on that much later
    8 end       JSON: how the run ended, and its counters
"""

import json
import struct
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from player.engine.framed import framed, frames

MAGIC = b"drawclog\x01\x00"
KINDS = {1: "head", 2: "state", 3: "command", 4: "set", 5: "sense", 6: "board", 7: "slip", 8: "end"}
_NUMBERS = {name: number for number, name in KINDS.items()}
_SET = struct.Struct("<QIQ")
_SENSE = struct.Struct("<QH")


@dataclass(frozen=True, slots=True, eq=False)
class Record:
    """One record as read: `told` for JSON bodies; times in s.

    due_s: when a set was due, or strains were sensed; values: (F,) uint16 of a set, (S,) strains of `fibers` (S,) of a sense
    """

    kind: str
    time_s: float
    told: dict[str, Any]
    due_s: float = 0.0
    late_s: float = 0.0
    position_s: float = 0.0
    values: NDArray[Any] | None = None
    fibers: NDArray[np.int64] | None = None


class RunLog:
    """Encodes records and hands each, whole, to `write`; after a failed write it stays silent and `broken` says why."""

    def __init__(self, write: Callable[[bytes], None]):
        self._write = write
        self.broken = ""
        self._put(MAGIC)

    def tell(self, kind: str, time_s: float, /, **told: Any) -> None:
        """A record with a JSON body."""
        self._record(kind, time_s, json.dumps(told, separators=(",", ":")).encode())

    def set(self, time_s: float, due_s: float, late_s: float, position_s: float, values: NDArray[np.uint16]) -> None:
        """A set that has been sent."""
        body = _SET.pack(_us(due_s), min(_us(late_s), 0xFFFFFFFF), _us(position_s)) + values.astype("<u2").tobytes()
        self._record("set", time_s, body)

    def sense(self, time_s: float, at_s: float, fibers: NDArray[np.int64], strain: NDArray[np.float64]) -> None:
        """Strains (S,) that a board has sensed of fibers (S,); a record for each run of neighbours."""
        for run in np.split(np.arange(len(fibers)), np.flatnonzero(np.diff(fibers) != 1) + 1):
            if run.size:
                head = _SENSE.pack(_us(at_s), int(fibers[run[0]]))
                self._record("sense", time_s, head + strain[run].astype("<f4").tobytes())

    def _record(self, kind: str, time_s: float, body: bytes) -> None:
        self._put(framed(_NUMBERS[kind], _us(time_s), body))

    def _put(self, data: bytes) -> None:
        if self.broken:
            return
        try:
            self._write(data)
        except OSError as error:
            self.broken = error.strerror or str(error)


def _us(seconds: float) -> int:
    return max(0, round(seconds * 1e6))


def records(data: bytes) -> tuple[list[Record], int]:
    """The records of a log, and how many bytes at its end are no whole record (0 for a log that was not cut off).

    Raises:
        ValueError: this is no run log.
    """
    if not data.startswith(MAGIC):
        raise ValueError("no run log of a version that is known here")
    at, found = len(MAGIC), []
    for number, time_us, body, end in frames(data, at, KINDS):
        found.append(_decoded(KINDS[number], time_us * 1e-6, body))
        at = end
    return found, len(data) - at


def _decoded(kind: str, time_s: float, body: bytes) -> Record:
    if kind == "set":
        due, late, position = _SET.unpack_from(body)
        values = np.frombuffer(body, dtype="<u2", offset=_SET.size)
        return Record(kind, time_s, {}, due * 1e-6, late * 1e-6, position * 1e-6, values)
    if kind == "sense":
        at, first = _SENSE.unpack_from(body)
        strain = np.frombuffer(body, dtype="<f4", offset=_SENSE.size)
        return Record(kind, time_s, {}, due_s=at * 1e-6, values=strain, fibers=np.arange(first, first + len(strain)))
    return Record(kind, time_s, json.loads(body))
