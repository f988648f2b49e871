"""Tracks made by hand, and engines in virtual time."""

from collections.abc import Callable

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, Tracks
from player.engine.clock import VirtualClock
from player.engine.loop import Engine
from player.engine.source import Driven
from player.outputs.base import Event, LinkLost, Mark


@pytest.fixture(scope="session")
def make_tracks() -> Callable[..., Tracks]:
    """A maker of tracks in which every fiber makes the same moves: (from s, to s, strain reached), between them it holds."""

    def make(fibers: int, moves: list[tuple[float, float, float]], shape: str = "smooth", duration_s: float = 0.0) -> Tracks:
        time, curve, manner = [0.0], [np.zeros(6)], [HOLD]
        at = 0.0
        for begins, ends, to in moves:
            along = (to - at) * PROGRESS[shape]
            along[0] += at
            if begins == time[-1]:
                time.pop(), curve.pop(), manner.pop()
            time += [begins, ends]
            curve += [along, np.array([to, 0.0, 0.0, 0.0, 0.0, 0.0])]
            manner += [MOVE, HOLD]
            at = to
        knots = len(time)
        nothing = np.zeros(fibers * knots, dtype=np.int32)
        return Tracks(
            first=np.arange(fibers + 1) * knots,
            time_s=np.tile(np.array(time), fibers),
            curve=np.tile(np.array(curve), (fibers, 1)),
            manner=np.tile(np.array(manner, dtype=np.int8), fibers),
            shape=np.full(fibers * knots, NAMES.index(shape), dtype=np.int8),
            line=nothing,
            phrase_line=nothing,
            duration_s=max(duration_s, time[-1]),
        )

    return make


class Kept:
    """An output that keeps all it is given, and does what a test has it do."""

    def __init__(self, drivers: tuple[str, ...] = ("main",), must_arm: bool = False, queue_sets: int = 0):
        self.target, self.drivers, self.must_arm, self.queue_sets = "kept", drivers, must_arm, queue_sets
        self.sets: list[tuple[float, np.ndarray]] = []
        self.deeds: list[str] = []
        self.events: list[Event] = []
        self.lost_at = float("inf")
        self.missing = False
        self.ready = True

    def open(self) -> None:
        self.deeds.append("open")

    def preflight(self, rate_Hz: float) -> tuple[Mark, ...]:
        return (Mark("it is ready", self.ready),)

    def arm(self) -> None:
        self._do("arm", "armed")

    def send(self, due_s: float, command: np.ndarray) -> None:
        if len(self.sets) >= self.lost_at:
            raise LinkLost("unplugged")
        self.sets.append((due_s, command.copy()))

    def rest(self, over_s: float) -> None:
        self._do("rest", "idle")

    def vent(self) -> None:
        self._do("vent", "vented")

    def _do(self, deed: str, status: str) -> None:
        self.deeds.append(deed)
        self.events.append(Event("state", self.drivers[0], status=status))

    def reattach(self) -> str:
        if self.missing:
            raise LinkLost("still unplugged")
        self.deeds.append("reattach")
        self.lost_at = float("inf")
        return "here"

    def poll(self) -> list[Event]:
        events, self.events = self.events, []
        return events

    def counters(self) -> dict[str, float]:
        return {"sets": len(self.sets)}

    def close(self) -> None:
        self.deeds.append("close")

    @property
    def due(self) -> np.ndarray:
        """Due times of all sets, (N,)."""
        return np.array([due for due, _ in self.sets])

    @property
    def commands(self) -> np.ndarray:
        """Commands of all sets, (N, F)."""
        return np.array([command for _, command in self.sets])


@pytest.fixture(scope="session")
def kept() -> type[Kept]:
    return Kept


@pytest.fixture
def make_engine() -> Callable[..., Engine]:
    """A maker of engines in virtual time, through their pre-flight and armed; other arguments go to the engine."""

    def make(rig, tracks, outputs, cues=(), late=None, armed: bool = True, **more) -> Engine:
        source = Driven(rig, abilities_of(rig), tracks, cues)
        engine = Engine(rig, source, outputs, VirtualClock(late=late), **more)
        if armed:
            engine.preflight()
            engine.arm()
        return engine

    return make
