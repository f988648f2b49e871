"""The form of a take: what was played, sample by sample, in one append-only file that can be read up to any byte.

The file begins with `MAGIC`; records as in `player.engine.framed`, their time that of the take: the place in the score, in µs.

    1 head    JSON: {"rig", "fingerprint", "fibers", "score", "rate_Hz", "date"}; rig and score are paths from the take's folder
    2 input   JSON: {"source", "control", "value"}: what a controller sent
    3 sample  runs of fibers that have changed since the sample before, each: first:u16 count:u16, then wanted:f32 strain of
              those fibers, then governed:f32 strain of them; a sample in which nothing has changed has no run
    4 end     JSON: {}: the take was ended, not cut off

All fibers are at rest before the first sample. The times of samples rise.
"""

import json
import struct
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from composer.faults import fault
from player.engine.framed import framed, frames

Array = NDArray[np.float64]

MAGIC = b"drawctak\x01\x00"
HEAD, INPUT, SAMPLE, END = 1, 2, 3, 4
KINDS = (HEAD, INPUT, SAMPLE, END)
MOST_FIBERS, MOST_SAMPLES, LONGEST_S = 65536, 20_000_000, 1e6
"""What is believed of a take."""

_RUN = struct.Struct("<HH")


class Recorder:
    """Encodes a take and hands each record, whole, to `write`; it keeps one sample of each fiber and no more.

    After a failed write it stays silent and `broken` says why.
    """

    def __init__(self, write: Callable[[bytes], None], fibers: tuple[str, ...], /, **told: Any):
        self._write = write
        self.broken = ""
        self.samples = 0
        self._last_us = -1
        self._wanted = np.zeros(len(fibers), dtype="<f4")
        self._governed = np.zeros(len(fibers), dtype="<f4")
        self._put(MAGIC)
        self._record(HEAD, 0, _json(fibers=fibers, **told))

    def input(self, time_s: float, source: str, control: str, value: float) -> None:
        """Something that a controller sent."""
        self._record(INPUT, _us(time_s), _json(source=source, control=control, value=value))

    def sample(self, time_s: float, wanted: Array, governed: Array) -> bool:
        """What every fiber was asked for and was let do, strain (F,) each; whether it was taken.

        A sample that is not later than the one before is not: while the score pauses, or has gone back, nothing is recorded.
        """
        at = _us(time_s)
        if at <= self._last_us:
            return False
        self._last_us = at
        wanted, governed = wanted.astype("<f4"), governed.astype("<f4")
        changed = np.flatnonzero((wanted != self._wanted) | (governed != self._governed))
        body = b""
        for run in np.split(changed, np.flatnonzero(np.diff(changed) != 1) + 1):
            if run.size:
                part = slice(int(run[0]), int(run[-1]) + 1)
                body += _RUN.pack(part.start, run.size) + wanted[part].tobytes() + governed[part].tobytes()
        self._wanted, self._governed = wanted, governed
        self._record(SAMPLE, at, body)
        self.samples += 1
        return True

    def end(self) -> None:
        """The take is over."""
        self._record(END, max(self._last_us, 0), _json())

    def _record(self, kind: int, time_us: int, body: bytes) -> None:
        self._put(framed(kind, time_us, body))

    def _put(self, data: bytes) -> None:
        if self.broken:
            return
        try:
            self._write(data)
        except OSError as error:
            self.broken = error.strerror or str(error)


def _json(**told: Any) -> bytes:
    return json.dumps(told, separators=(",", ":")).encode()


def _us(seconds: float) -> int:
    return max(0, round(seconds * 1e6))


@dataclass(frozen=True, slots=True, eq=False)
class Changes:
    """One quantity of all fibers where it changed: those of fiber f are `first[f]:first[f + 1]`, sample and new value."""

    first: NDArray[np.int64]
    sample: NDArray[np.int64]
    value: NDArray[np.float32]


@dataclass(frozen=True, slots=True, eq=False)
class Take:
    """A take as read; it needs memory in proportion to its file, whatever the file says.

    rig, score: paths as written, "" for none; fingerprint: of the rig; fibers: names in the rig's order
    time_s: (T,) instants of the samples, rising; wanted, governed: strains
    inputs: time in s, source, control and value of each
    complete: whether it was ended; left_bytes: how many at its end are no whole record
    """

    rig: str
    score: str
    fingerprint: int
    fibers: tuple[str, ...]
    time_s: Array
    wanted: Changes
    governed: Changes
    inputs: tuple[tuple[float, str, str, float], ...]
    complete: bool
    left_bytes: int

    def strain(self, of: Changes, fiber: int) -> Array:
        """Strain (T,) of one fiber at every sample; `of` is `wanted` or `governed`."""
        mine = slice(of.first[fiber], of.first[fiber + 1])
        value = np.concatenate([[0.0], of.value[mine]])
        return value[np.searchsorted(of.sample[mine], np.arange(len(self.time_s)), side="right")]


def read_take(data: bytes, file: str) -> Take:
    """A take from its bytes, up to the last whole record.

    Raises:
        Faults: no take, one of a version that is not known, a head that is damaged, records that cannot be, or no sample.
    """
    if not data.startswith(MAGIC):
        other = data.startswith(MAGIC[:8]) and len(data) >= len(MAGIC)
        found = "a take of another version" if other else "this is no take"
        raise fault(file, found, "a file recorded by 'drawcord live RIG --take FILE'")
    reader = _Reader(file)
    at = len(MAGIC)
    for kind, time_us, body, end in frames(data, at, KINDS):
        reader.take(kind, time_us, body)
        at = end
        if reader.complete:
            break
    return reader.done(len(data) - at)


class _Reader:
    """What grows while a take is read."""

    def __init__(self, file: str):
        self.file = file
        self.head: dict[str, Any] | None = None
        self.times: list[int] = []
        self.runs: list[tuple[int, int, int]] = []
        self.values: list[bytes] = []
        self.inputs: list[tuple[float, str, str, float]] = []
        self.complete = False

    def take(self, kind: int, time_us: int, body: bytes) -> None:
        if (kind == HEAD) != (self.head is None):
            raise self.damaged("its head is not its first record")
        if kind == HEAD:
            self.head = self.checked_head(self.told(body))
        elif kind == INPUT:
            told = self.told(body)
            try:
                self.inputs.append((time_us * 1e-6, str(told["source"]), str(told["control"]), float(told["value"])))
            except (KeyError, TypeError, ValueError, OverflowError):
                raise self.damaged("an input of it cannot be read") from None
        elif kind == SAMPLE:
            self.sample(time_us, body)
        else:
            self.complete = True

    def sample(self, time_us: int, body: bytes) -> None:
        if self.times and time_us <= self.times[-1]:
            raise self.damaged("its samples go back in time")
        if time_us > LONGEST_S * 1e6 or len(self.times) >= MOST_SAMPLES:
            raise fault(self.file, "the take is too long", f"at most {LONGEST_S:g} s and {MOST_SAMPLES} samples")
        fibers, at, past = len(self.head["fibers"]), 0, 0
        while at < len(body):
            if at + _RUN.size > len(body):
                raise self.damaged("a sample of it is cut short")
            first, count = _RUN.unpack_from(body, at)
            at += _RUN.size
            if count == 0 or first < past or first + count > fibers or at + 8 * count > len(body):
                raise self.damaged("a sample of it names fibers that are not there")
            self.runs.append((len(self.times), first, count))
            self.values.append(body[at : at + 8 * count])
            at, past = at + 8 * count, first + count
        self.times.append(time_us)

    def told(self, body: bytes) -> dict[str, Any]:
        try:
            told = json.loads(body)
        except (ValueError, RecursionError):
            told = None
        if not isinstance(told, dict):
            raise self.damaged("a record of it cannot be read")
        return told

    def checked_head(self, told: dict[str, Any]) -> dict[str, Any]:
        names, mark = told.get("fibers"), told.get("fingerprint")
        texts = [told.get("rig", ""), told.get("score", "")]
        good = isinstance(names, list) and 0 < len(names) <= MOST_FIBERS and isinstance(mark, int)
        if not good or not all(isinstance(text, str) for text in (*names, *texts)):
            raise self.damaged("its head does not name the rig and its fibers")
        return told

    def damaged(self, why: str) -> Exception:
        return fault(self.file, f"the take is damaged: {why}", hint="it was changed after it was recorded")

    def done(self, left: int) -> Take:
        if self.head is None or not self.times:
            raise fault(self.file, "there is not one whole sample in this take", hint="record it again")
        wanted, governed = self.changes(len(self.head["fibers"]))
        return Take(
            rig=self.head.get("rig", ""),
            score=self.head.get("score", ""),
            fingerprint=self.head["fingerprint"],
            fibers=tuple(self.head["fibers"]),
            time_s=np.array(self.times, dtype=float) * 1e-6,
            wanted=wanted,
            governed=governed,
            inputs=tuple(self.inputs),
            complete=self.complete,
            left_bytes=left,
        )

    def changes(self, fibers: int) -> tuple[Changes, Changes]:
        """Both quantities by fiber and then by time."""
        sample, first, count = np.array(self.runs, dtype=np.int64).reshape(-1, 3).T
        flat = np.frombuffer(b"".join(self.values), dtype="<f4")
        self.values.clear()
        starts = np.cumsum(count) - count
        within = np.arange(int(count.sum())) - np.repeat(starts, count)
        # A run holds its fibers' wanted, then their governed strains.
        place = np.repeat(2 * starts, count) + within
        fiber, when = np.repeat(first, count) + within, np.repeat(sample, count)
        order = np.argsort(fiber, kind="stable")
        begins = np.searchsorted(fiber[order], np.arange(fibers + 1))
        both = []
        for values in (flat[place], flat[place + np.repeat(count, count)]):
            if not np.all(np.abs(values) < 1e3):
                raise self.damaged("a strain of it cannot be")
            both.append(Changes(begins, when[order], values[order]))
        return both[0], both[1]
