"""What every output is to the engine: a few verbs, and what it tells back as data.

An output stands for one board of valves, or for several at once where it is no real board. The engine hands it the command of
the whole rig in drive units; the output picks out the fibers of its own drivers. Times are seconds on the engine's clock.
"""

from dataclasses import dataclass, field
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from composer.rig.model import Rig

Array = NDArray[np.float64]


class LinkLost(Exception):
    """The way to a board is gone: unplugged, closed at the other end, or failing every write; the text says which."""


@dataclass(frozen=True, slots=True)
class Mark:
    """One line of a pre-flight: what was asked, whether it is so, what was found, and what to do where it is not."""

    asked: str
    ok: bool
    found: str = ""
    hint: str = ""


@dataclass(frozen=True, slots=True, eq=False)
class Event:
    """What an output tells the engine.

    kind: "state" (`status` is what the board says it is in: idle, armed, vented, fault), "sense" (`strain` of `fibers` at
        `time_s`), "supply" (`kPa` gauge), "fault" (`code` as in the wire protocol), "silent" and "garbled" (what is the matter
        with its line), "lost" (its link is gone), or "note" (worth telling, no more)
    driver: whose board; say: a sentence for the operator
    time_s: when, on the engine's clock; nan where that is not known
    fibers, strain: (S,) indices in the rig's order, and strains (1)
    """

    kind: str
    driver: str
    say: str = ""
    code: int = 0
    status: str = ""
    time_s: float = float("nan")
    fibers: NDArray[np.int64] = field(default_factory=lambda: np.empty(0, dtype=np.int64))
    strain: Array = field(default_factory=lambda: np.empty(0))
    kPa: float = float("nan")


class Output(Protocol):
    """A place that sets are sent to. Every verb may raise `LinkLost`, `open` raises `Faults` for what the operator wrote wrong.

    target: as the operator wrote it, without `DRIVER=`; drivers: the names of the rig's drivers it stands for
    must_arm: whether the operator has to arm it by a deed of his own (a real board does)
    queue_sets: how many sets it keeps ahead of their due time, 0 for any number; known after `preflight`
    """

    target: str
    drivers: tuple[str, ...]
    must_arm: bool
    queue_sets: int

    def open(self) -> None:
        """Take hold of the port or file; nothing moves."""

    def preflight(self, rate_Hz: float) -> tuple[Mark, ...]:
        """Ask all that must be true before arming, at that many sets a second."""

    def arm(self) -> None:
        """Make the board ready to move; returns once it says so."""

    def send(self, due_s: float, command: Array) -> None:
        """The set that is to take effect at `due_s`: (F,) drive units for the whole rig; never blocks."""

    def rest(self, over_s: float) -> None:
        """Bring all to rest over that time, whatever is queued, and disarm; 0 where all are at rest already."""

    def vent(self) -> None:
        """Exhaust every channel now, whatever is queued, and disarm."""

    def poll(self) -> list[Event]:
        """What has come in since the last time; never blocks."""

    def reattach(self) -> str:
        """Take hold again of a board whose link was lost; returns where it was found. Raises LinkLost where it is not there."""

    def counters(self) -> dict[str, float]:
        """Counts for the report: sets sent, late at the device, bad frames, and whatever else the output can tell."""

    def close(self) -> None:
        """Let go of the port or file; harmless when called twice."""


def fibers_of(rig: Rig, drivers: tuple[str, ...]) -> NDArray[np.int64]:
    """Indices of the fibers on those drivers, in the rig's order."""
    return np.array([i for i, fiber in enumerate(rig.fibers) if fiber.driver in drivers], dtype=np.int64)
