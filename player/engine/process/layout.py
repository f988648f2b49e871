"""What a run shows of itself in shared memory: a fixed layout, written once a tick, read by any number of front ends.

Two slots take turns. The engine fills the one that nobody is told of, then raises the count, whose lowest bit says which slot
is whole: a reader copies that slot, and takes the copy if the count is still the same. Neither ever waits for the other, and an
engine killed in the midst of writing leaves the slot before it whole.
"""

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from player.engine.safety import STATES

Array = NDArray[np.float64]

MAGIC = b"drawshm\x00"
VERSION = 1
LINE, NAME, WORD = 160, 96, 24
"""Bytes of a line that was told, of a cue's name, of a state; longer ones are cut."""

LINES = 12
"""Last lines of what was told."""

TRIES = 100
STATE_NAMES = tuple(STATES)

HEAD = np.dtype([("magic", "S8"), ("version", "<u4"), ("fibers", "<u4"), ("boards", "<u4"), ("spare", "<u4"), ("count", "<u8")])

FIELDS = (
    ("at_s", "<f8", "", "when this was written, on the engine's monotonic clock"),
    ("state", "u1", "", "index into STATE_NAMES"),
    ("phase", f"S{WORD}", "", "what the score is at"),
    ("position_s", "<f8", "", "of the score"),
    ("duration_s", "<f8", "", "of the score"),
    ("place", f"S{WORD}", "", "position_s as bar and count"),
    ("counts_a_minute", "<f8", "", "the running tempo; nan where there is none"),
    ("cue", f"S{NAME}", "", "the last cue passed"),
    ("next_cue", f"S{NAME}", "", "the one that comes"),
    ("next_cue_s", "<f8", "", "its place in the score; nan without one"),
    ("waiting", f"S{NAME}", "", "the cue at which the score waits"),
    ("moving", "<u4", "", "fibers that move"),
    ("let_down", "<u4", "", "fibers that a pause, or an alarm, has let down"),
    ("ticks", "<u8", "", "since the start"),
    ("late_ticks", "<u8", "", "late by more than a tick"),
    ("past_due", "<u8", "", "later than all that was sent ahead"),
    ("late_s", "<f8", "", "of the last tick"),
    ("worst_late_s", "<f8", "", "of all ticks"),
    ("commanded", "u1", "", "1 where a front end commands"),
    ("watching", "<u4", "", "front ends attached, the one that commands with them"),
    ("held", "u1", "", "hold-to-run is down; 1 where none is wanted"),
    ("air_left", "<f8", "", "share of the receiver's usable air, as the governor reckons; nan without a governor"),
    ("air_share", "<f8", "", "share of the air asked for that is there; nan without a governor"),
    ("wanted", "<f8", "fibers", "strain wanted: of the hands and the score, before the governor"),
    ("allowed", "<f8", "fibers", "strain after the governor; as wanted without one"),
    ("sent", "<f8", "fibers", "the command, in the drive's units"),
    ("sensed", "<f8", "fibers", "strain as last sensed; nan where it is not"),
    ("duty", "<f8", "fibers", "energised seconds not yet given back, as a share of those that may be; nan where not reckoned"),
    ("cut", "i1", "fibers", "index into player.governor.causes.CAUSES: why the governor holds it back"),
    ("by", "<f8", "fibers", "strain wanted less strain allowed"),
    ("touched", "u1", "fibers", "1 where a hand has it"),
    ("link", f"S{WORD}", "boards", "armed, idle, vented, fault, lost, closed: a word a board"),
    ("supply_kPa", "<f8", "boards", "as last sensed; nan where it is not"),
    ("lines_told", "<u8", "", "how many lines have been told in all"),
    ("lines", f"S{LINE}", "lines", "the last of them, oldest first, empty ones before the first"),
)
"""A slot: name, type, what it has one of for each, meaning. Links are in the order of `about`'s "boards", supplies too."""


def slot_type(fibers: int, boards: int) -> np.dtype:
    """The type of a slot for a rig of that size."""
    counts = {"fibers": fibers, "boards": boards, "lines": LINES}
    return np.dtype([(name, kind, (counts[of],)) if of else (name, kind) for name, kind, of, _ in FIELDS])


def size_of(fibers: int, boards: int) -> int:
    """Bytes of shared memory for a rig of that size."""
    return HEAD.itemsize + 2 * slot_type(fibers, boards).itemsize


def text(value: str, most: int) -> bytes:
    """A text as a slot has it: UTF-8 of at most so many bytes, cut between two characters."""
    return value.encode(errors="replace")[:most].decode(errors="ignore").encode()


class Writer:
    """The engine's side, over a writable buffer of `size_of` bytes."""

    def __init__(self, buffer, fibers: int, boards: int):
        self._head = np.frombuffer(buffer, HEAD, 1)
        self._slots = np.frombuffer(buffer, slot_type(fibers, boards), 2, HEAD.itemsize)
        self._head[0] = (MAGIC, VERSION, fibers, boards, 0, 0)
        self._scratch = np.zeros((), self._slots.dtype)
        for name, kind, _, _ in FIELDS:
            if kind == "<f8":
                self._scratch[name] = np.nan

    @property
    def slot(self) -> np.ndarray:
        """What will be shown next: set its fields, then `show`."""
        return self._scratch

    def show(self) -> None:
        """Make it what readers see."""
        count = int(self._head["count"][0]) + 1
        self._slots[count & 1] = self._scratch
        self._head["count"][0] = count


@dataclass(frozen=True, slots=True, eq=False)
class Snapshot:
    """One moment of a run, whole: a copy that nobody writes into. Fields of FIELDS by name in `of`, or by the methods.

    count: rises with every moment shown; 0 before the first
    """

    count: int
    of: np.ndarray = field(repr=False)

    @property
    def state(self) -> str:
        """As in player.engine.safety."""
        return STATE_NAMES[min(int(self.of["state"]), len(STATE_NAMES) - 1)]

    def text(self, name: str) -> str:
        """A text of the slot."""
        return bytes(self.of[name]).decode(errors="replace")

    def texts(self, name: str) -> tuple[str, ...]:
        """The texts of a field that has several."""
        return tuple(bytes(one).decode(errors="replace") for one in self.of[name])

    def number(self, name: str) -> float:
        """A number of the slot."""
        return float(self.of[name])

    def array(self, name: str) -> np.ndarray:
        """A row of numbers, one a fiber or a board."""
        return self.of[name]


class Unreadable(ValueError):
    """Shared memory that is not of this layout; the text says in what."""


class Reader:
    """A front end's side, over a buffer that may be read only."""

    def __init__(self, buffer):
        if len(buffer) < HEAD.itemsize:
            raise Unreadable("the engine's shared memory is too short")
        self._head = np.frombuffer(buffer, HEAD, 1)
        head = self._head[0]
        if bytes(head["magic"]) != MAGIC.rstrip(b"\x00") or int(head["version"]) != VERSION:
            raise Unreadable("the engine's shared memory is of another version: use the same drawcord for both")
        self.fibers, self.boards = int(head["fibers"]), int(head["boards"])
        if self.fibers > 1 << 20 or self.boards > 1 << 16 or len(buffer) < size_of(self.fibers, self.boards):
            raise Unreadable("the engine's shared memory is too short")
        self._slots = np.frombuffer(buffer, slot_type(self.fibers, self.boards), 2, HEAD.itemsize)
        self._last = Snapshot(0, np.zeros((), self._slots.dtype))

    def snapshot(self) -> Snapshot:
        """The latest moment; the one before where the engine is too quick, or nothing new where nothing is."""
        for _ in range(TRIES):
            count = int(self._head["count"][0])
            if count == self._last.count:
                break
            copied = self._slots[count & 1].copy()
            if int(self._head["count"][0]) == count:
                self._last = Snapshot(count, copied)
                break
        return self._last
