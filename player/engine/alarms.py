"""What sensed strain can show to be wrong, and what is done about it: one table for engine, manual and tests; and the watch.

Pure: times are handed in. Sensed strain is held against a zone: the lowest to the highest that was wanted within SLACK_S of the
instant of sensing, so that the delays of line, valve and fiber are no alarm.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.int64]

WARN, REST_FIBER, REST_ALL, VENT = "warn", "rest that fiber", "rest all", "vent"

DOES = {
    WARN: "it is told and kept for the report; the run goes on",
    REST_FIBER: "that fiber is brought to rest at its safe rate and stays there; the run goes on without it",
    REST_ALL: "all come to rest; the run ends with 1",
    VENT: "all boards vent; the run ends with 1",
}
"""What an alarm may do."""


@dataclass(frozen=True, slots=True)
class Alarm:
    """A row: what is seen, what it does (a key of DOES), the sentence, and what the operator may do."""

    seen: str
    does: str
    says: str
    hint: str


ALARMS = {
    "leak": Alarm(
        "a fiber falls while it should hold",
        REST_FIBER,
        "falls while it should hold",
        "look for a leak at the fiber and its tube",
    ),
    "stuck": Alarm(
        "a fiber does not move though it should",
        REST_ALL,
        "does not move though it should",
        "its valve may be stuck, perhaps open: look at the valve, its plug and the tube",
    ),
    "drift": Alarm(
        "a fiber is off by more and more, over many seconds",
        WARN,
        "is further and further from where it should be",
        "its fit is old, or its sensor drifts: fit the type again, or trim it",
    ),
    "runs": Alarm(
        "a fiber stands further and further off, run after run",
        WARN,
        "stands further off from run to run",
        "its fit is old, or its sensor drifts: fit the type again, or look at the sensor's plug",
    ),
    "jump": Alarm(
        "a sensor jumps faster than any fiber moves", WARN, "is said to have jumped", "look at the sensor's plug and cable"
    ),
    "rail": Alarm(
        "a sensor stands at the end of its range though the fiber cannot be there",
        WARN,
        "is said to be at full stroke",
        "look at the sensor's plug and cable",
    ),
    "supply": Alarm(
        "the supply reads below the rig's least",
        REST_ALL,
        "the supply is below its minimum",
        "look at compressor, receiver and regulator",
    ),
}
"""Name of each alarm: its row."""

SLACK_S = 0.2
EVERY_S = 0.045
"""Senses that come more often are looked at so often."""
KEEP = 32
"""Looks that are remembered: a second and a half."""
HOLD_S, MOVE_S = 0.6, 1.2
"""Leaks are looked for over the first, stuck valves over the second."""
STILL, HELD = 0.01, 0.1
"""Shares of stroke: wants within the first stand still; fibers wanted above the second are held."""
LEAK, STUCK_WANTED, STUCK_MOVED, OFF, RAIL = 0.05, 0.25, 0.02, 0.15, 0.999
JUMP = 0.15
"""A jump is so much more than twice what the fiber can do in the time."""
DRIFT, DRIFT_S = 0.06, 15.0
"""Off by so much on the average of so long, while it stands."""


@dataclass(frozen=True, slots=True)
class Raised:
    """An alarm: its name in ALARMS, and the fiber (-1: none)."""

    name: str
    fiber: int


class Watch:
    """Looks at what is sensed of every fiber; each alarm is raised once a fiber.

    fastest: (F,) shares of stroke a second that a fiber moves at most
    """

    def __init__(self, fastest: Array):
        fibers = len(fastest)
        self.lies = np.zeros(fibers, dtype=bool)
        self.alarmed = np.zeros(fibers, dtype=bool)
        self._fastest = fastest
        # A ring a fiber: boards sense each at their own moments. What is newest stands apart, so that no look is sorted.
        self._at = np.full((KEEP, fibers), -np.inf)
        self._share = np.zeros((KEEP, fibers))
        self._low, self._high = np.zeros((KEEP, fibers)), np.zeros((KEEP, fibers))
        self._next = np.zeros(fibers, dtype=np.int64)
        self._last_s, self._last = np.full(fibers, -np.inf), np.zeros(fibers)
        self._off = np.zeros(fibers)
        self._raised: set[Raised] = set()

    def due(self, at_s: float, fibers: Index) -> bool:
        """Whether any of fibers (S,) was last looked at long enough ago."""
        return bool((at_s - self._last_s[fibers] >= EVERY_S).any())

    def look(self, at_s: float, fibers: Index, share: Array, low: Array, high: Array) -> list[Raised]:
        """What was sensed of fibers (S,) as shares of stroke, and the zone in which it was wanted; alarms that are new."""
        due = at_s - self._last_s[fibers] >= EVERY_S
        if not due.all():
            fibers, share, low, high = fibers[due], share[due], low[due], high[due]
        if not fibers.size:
            return []
        since = np.minimum(at_s - self._last_s[fibers], 10.0)
        known = np.isfinite(self._last_s[fibers])
        step = np.where(known, np.abs(share - self._last[fibers]), 0.0)
        far = (share > high + OFF) | (share < low - OFF)
        jumps = known & (step > JUMP + 2.0 * self._fastest[fibers] * since) & far
        place = self._next[fibers]
        for kept, new in ((self._at, at_s), (self._share, share), (self._low, low), (self._high, high)):
            kept[place, fibers] = new
        self._next[fibers] = (place + 1) % KEEP
        self._last_s[fibers], self._last[fibers] = at_s, share
        rails = (share >= RAIL) & (high < 1.0 - OFF)
        # What lies is told once, and is not believed about leaks and valves from then on.
        found = self._new("rail", fibers[rails]) + self._new("jump", fibers[jumps & ~rails])
        self.lies[fibers[rails | jumps]] = True
        honest = ~self.lies[fibers]
        # Memory is searched for those alone that are off now: of thousands of fibers mostly none.
        off = honest & (far | (share < low - LEAK))
        if off.any():
            leaks, stuck = self._held(at_s, fibers[off], share[off], low[off], far[off])
            found += self._new("leak", fibers[off][leaks]) + self._new("stuck", fibers[off][stuck & ~leaks])
        return found + self._new("drift", fibers[self._drifts(fibers, share, low, high, since) & honest])

    def forget(self) -> None:
        """As if nothing had been sensed: after all have been to rest. What was raised stays raised."""
        self._at[:] = -np.inf
        self._last_s[:] = -np.inf
        self._off[:] = 0.0

    def _held(
        self, at_s: float, fibers: Index, now: Array, least: Array, far: NDArray[np.bool_]
    ) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """Which fibers (S,) leak, and which stand though they should move; now, least: sensed and wanted; far: or far off."""
        share, low, high = self._share[:, fibers], self._low[:, fibers], self._high[:, fibers]
        near, long = self._lately(at_s, fibers, HOLD_S)
        still = (_most(high, near) - _least(low, near) < STILL) & (_least(low, near) > HELD)
        leaks = long & still & (_most(share, near) - now > LEAK) & (now < least - LEAK)
        near, long = self._lately(at_s, fibers, MOVE_S)
        wanted = _most(low, near) - _least(high, near) > STUCK_WANTED
        stands = _most(share, near) - _least(share, near) < STUCK_MOVED
        return leaks, long & wanted & far & stands

    def _lately(self, at_s: float, fibers: Index, within_s: float) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """Which looks (KEEP, S) are of late, and for which fibers (S,) they are of nearly all that time."""
        at = self._at[:, fibers]
        near = at >= at_s - within_s
        oldest = np.where(near, at, np.inf).min(axis=0)
        return near, (at_s - oldest >= 0.75 * within_s) & (near.sum(axis=0) >= 4)

    def _drifts(self, fibers: Index, share: Array, low: Array, high: Array, since: Array) -> NDArray[np.bool_]:
        """Which fibers are off on the average of a long time, while they stand; leaks and valves are off at once."""
        still = high - low < STILL
        error = np.where(still, share - np.clip(share, low, high), 0.0)
        weight = np.where(still & (np.abs(error) < OFF), np.minimum(since, 1.0) / DRIFT_S, 0.0)
        self._off[fibers] += weight * (error - self._off[fibers])
        return np.abs(self._off[fibers]) > DRIFT

    def _new(self, name: str, fibers: Index) -> list[Raised]:
        found = [Raised(name, fiber) for fiber in fibers.tolist() if Raised(name, fiber) not in self._raised]
        self._raised.update(found)
        self.alarmed[fibers] = True
        return found


def _least(values: Array, near: NDArray[np.bool_]) -> Array:
    return np.where(near, values, np.inf).min(axis=0)


def _most(values: Array, near: NDArray[np.bool_]) -> Array:
    return np.where(near, values, -np.inf).max(axis=0)
