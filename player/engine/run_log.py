"""The log of a run: one append-only file of framed records, so that a run cut off at any byte can be read up to there.

The file begins with `MAGIC`; its records are those of `player.engine.framed`, their time the engine's monotonic clock. Bodies,
little-endian:

    1 head      JSON: what is played, on which rig, to which targets, from which date; what is known of each fiber
    2 state     JSON: {"was", "event", "state"}
    3 command   JSON: {"command", "value"}: what the operator or a signal asked for
    4 set       due_us:i32 from the record's time, late_us:u24, position:u32 in 10 µs; then for every fiber, in the rig's order,
                value:u16 as on the wire, and wanted:u16, the strain it stands for as a share of stroke, 0 to 65535
    5 sense     at_us:i32 from the record's time, layout:u16, strain:u16 for each fiber of the layout, 0 to 65535 of its stroke
    6 board     JSON: {"driver", "kind", "say", "code", "status"}: what a board told: states, faults, notes
    7 slip      JSON: {"seconds"}: the host stood still longer than sets were ahead; the score went on that much later
    8 end       JSON: how the run ended, and its counters; "trim": what was learned, for every fiber a share of stroke a level
    9 sent      as set, without the strains wanted: for a recording, which knows none
    10 hits     JSON: {"hits": [[at_us, place, [fibers]]]}: where in the score moves land; at_us from its start
    11 supply   driver:u16, kPa × 10:u16: what a board's sensor of the supply reads
    12 layout   JSON: {"layout", "fibers"}: which fibers a sense is of, written before the first such sense
    13 alarm    JSON: {"alarm", "fiber", "does", "say"}: sensed strain shows that something is wrong
    14 input    JSON: {"source", "what", "value"}: what a controller or another program sent, as it was understood
    15 cut      JSON: {"why", "fibers", "by"}: what the governor holds back: indices of fibers, and strain of the worst
    16 front    JSON: {"what", "say", "attached"}: a front end attached, commands, left or is gone; what was refused, and why
    17 system   JSON: {"priority", "memory", "why"}: priority real-time or usual, memory locked or usual, and why not

A set takes at most twice the bytes that it has on the wire, a sense and a supply less than that.
"""

import json
import math
import struct
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from player.engine.framed import framed, frames

MAGIC = b"drawclog\x02\x00"
KINDS = {
    1: "head",
    2: "state",
    3: "command",
    4: "set",
    5: "sense",
    6: "board",
    7: "slip",
    8: "end",
    9: "sent",
    10: "hits",
    11: "supply",
    12: "layout",
    13: "alarm",
    14: "input",
    15: "cut",
    16: "front",
    17: "system",
}
_NUMBERS = {name: number for number, name in KINDS.items()}
_SET = struct.Struct("<i3sI")
_SENSE = struct.Struct("<iH")
_SUPPLY = struct.Struct("<HH")
FULL = 65535
LAYOUTS = 4096
"""Different sets of fibers that senses may be of; one more is not logged."""

LONGEST_NUMBER = 40
"""Characters of a number in a JSON body."""

POSITION_S = 1e-5
"""What a unit of a set's place in the score is worth."""


@dataclass(frozen=True, slots=True, eq=False)
class Record:
    """One record as read: `told` for JSON bodies; times in s.

    due_s: when a set was due, or strains were sensed; values: (F,) uint16 of a set, (S,) of a sense; wanted: (F,) uint16
    number: the layout of a sense, the driver of a supply; kPa: of a supply
    """

    kind: str
    time_s: float
    told: dict[str, Any]
    due_s: float = 0.0
    late_s: float = 0.0
    position_s: float = 0.0
    values: NDArray[np.uint16] | None = None
    wanted: NDArray[np.uint16] | None = None
    number: int = 0
    kPa: float = 0.0


class RunLog:
    """Encodes records and hands each, whole, to `write`; after a failed write it stays silent and `broken` says why."""

    def __init__(self, write: Callable[[bytes], None]):
        self._write = write
        self._layouts: dict[bytes, int] = {}
        self.broken = ""
        self._put(MAGIC)

    def tell(self, kind: str, time_s: float, /, **told: Any) -> None:
        """A record with a JSON body."""
        self._record(kind, time_s, json.dumps(told, separators=(",", ":")).encode())

    def set(
        self,
        time_s: float,
        due_s: float,
        late_s: float,
        position_s: float,
        values: NDArray[np.uint16],
        wanted: NDArray[np.uint16] | None = None,
    ) -> None:
        """A set that has been sent, and the strains (F,) that it stands for, where they are known."""
        late = min(_us(late_s), 0xFFFFFF).to_bytes(3, "little")
        position = min(max(0, round(position_s / POSITION_S)), 0xFFFFFFFF)
        body = _SET.pack(_apart(due_s, time_s), late, position) + values.astype("<u2").tobytes()
        if wanted is None:
            self._record("sent", time_s, body)
        else:
            self._record("set", time_s, body + wanted.astype("<u2").tobytes())

    def sense(self, time_s: float, at_s: float, fibers: NDArray[np.int64], share: NDArray[np.float64]) -> None:
        """Shares of stroke (S,) that a board has sensed of fibers (S,)."""
        key = fibers.tobytes()
        if key not in self._layouts:
            if len(self._layouts) >= LAYOUTS:
                return
            self._layouts[key] = len(self._layouts)
            self.tell("layout", time_s, layout=self._layouts[key], fibers=fibers.tolist())
        values = np.rint(np.clip(share, 0.0, 1.0) * FULL).astype("<u2").tobytes()
        self._record("sense", time_s, _SENSE.pack(_apart(at_s, time_s), self._layouts[key]) + values)

    def supply(self, time_s: float, driver: int, kPa: float) -> None:
        """What the supply's sensor at a driver's board reads."""
        self._record("supply", time_s, _SUPPLY.pack(driver, min(max(round(kPa * 10.0), 0), FULL)))

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


def _apart(one_s: float, from_s: float) -> int:
    """Microseconds from one time to another, as far as 32 bits go (36 minutes)."""
    return min(max(_us(one_s) - _us(from_s), -0x80000000), 0x7FFFFFFF)


def walk(data: bytes) -> Iterator[tuple[Record, int]]:
    """The records of a log, each with the byte at which it ends; ends at what is cut off, damaged or makes no sense.

    Raises:
        ValueError: this is no run log.
    """
    if not data.startswith(MAGIC):
        raise ValueError("no run log of a version that is known here")
    for number, time_us, body, end in frames(data, len(MAGIC), KINDS):
        try:
            record = _decoded(KINDS[number], time_us * 1e-6, body)
        except (ValueError, struct.error, RecursionError):
            return
        yield record, end


def records(data: bytes) -> tuple[list[Record], int]:
    """The records of a log, and how many bytes at its end are no whole record (0 for a log that was not cut off).

    Raises:
        ValueError: this is no run log.
    """
    found, end = [], len(MAGIC)
    for record, end in walk(data):  # noqa: B007
        found.append(record)
    return found, len(data) - end


def _decoded(kind: str, time_s: float, body: bytes) -> Record:
    if kind in ("set", "sent"):
        due, late, position = _SET.unpack_from(body)
        values = np.frombuffer(body, dtype="<u2", offset=_SET.size)
        wanted = None
        if kind == "set":
            values, wanted = values.reshape(2, -1)
        return Record(
            kind,
            time_s,
            {},
            time_s + due * 1e-6,
            int.from_bytes(late, "little") * 1e-6,
            position * POSITION_S,
            values,
            wanted,
        )
    if kind == "sense":
        at, layout = _SENSE.unpack_from(body)
        values = np.frombuffer(body, dtype="<u2", offset=_SENSE.size)
        return Record(kind, time_s, {}, due_s=time_s + at * 1e-6, values=values, number=layout)
    if kind == "supply":
        driver, tenths = _SUPPLY.unpack(body)
        return Record(kind, time_s, {}, number=driver, kPa=tenths / 10.0)
    told = json.loads(body, parse_constant=_number, parse_float=_number, parse_int=_number)
    if not isinstance(told, dict):
        raise ValueError("a JSON object was expected")
    return Record(kind, time_s, _printable(told))


def _number(text: str) -> float | int:
    """A number of JSON, as far as a log has any; ValueError for what is not finite or longer than that."""
    if len(text) > LONGEST_NUMBER:
        raise ValueError("a number without end")
    value = int(text) if text.lstrip("-").isdecimal() else float(text)
    if not math.isfinite(value):
        raise ValueError("a number that is not finite")
    return value


def _printable(value: Any) -> Any:
    """The same with what no terminal should be sent, and no file can hold, made visible in all texts."""
    if isinstance(value, str):
        return value if value.isprintable() else "".join(c if c.isprintable() else "\N{REPLACEMENT CHARACTER}" for c in value)
    if isinstance(value, list):
        return [_printable(one) for one in value]
    if isinstance(value, dict):
        return {_printable(name): _printable(one) for name, one in value.items()}
    return value
