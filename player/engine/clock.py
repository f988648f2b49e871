"""The only place that asks the operating system what time it is, and the clock that tests use in its stead."""

import calendar
import time
from collections.abc import Callable
from typing import Protocol

STAMP = "%Y-%m-%dT%H:%M:%SZ"


class Clock(Protocol):
    """Seconds that only ever go forward, from an origin of no meaning."""

    def now(self) -> float:
        """The present time."""

    def wait_until(self, moment_s: float) -> float:
        """Return at that time, or at once where it has passed; returns the time it then is."""


class SteadyClock:
    """The machine's monotonic clock. Sleeping is coarse, so the last `spin_s` before a moment are spent asking the time."""

    def __init__(self, spin_s: float = 0.0002):
        self._spin_s = spin_s

    def now(self) -> float:
        """The present time in seconds."""
        return time.monotonic()

    def wait_until(self, moment_s: float) -> float:
        """Sleep, then spin the last fraction; a signal's handler runs meanwhile and does not cut the wait short."""
        now = time.monotonic()
        while (left := moment_s - now) > 0.0:
            if left > self._spin_s:
                time.sleep(left - self._spin_s)
            now = time.monotonic()
        return now


class VirtualClock:
    """A clock that jumps to whatever it is asked to wait for, so that an hour passes in the time of its arithmetic.

    late: seconds by which a wait for a given moment comes back too late, as a busy host would
    """

    def __init__(self, start_s: float = 0.0, late: Callable[[float], float] | None = None):
        self._now = start_s
        self._late = late

    def now(self) -> float:
        """The present time in seconds."""
        return self._now

    def wait_until(self, moment_s: float) -> float:
        """Let time pass up to that moment, and a little more where the host is to be late."""
        if moment_s > self._now:
            self._now = moment_s + (self._late(moment_s) if self._late else 0.0)
        return self._now


def stamp() -> str:
    """The date and time of day in UTC, for the head of a run's log."""
    return time.strftime(STAMP, time.gmtime())


def time_of_day() -> float:
    """Seconds since 1970 by the machine's calendar, for time tags; it may jump, so nothing else goes by it."""
    return time.time()


def time_of(stamped: str) -> float:
    """The time of day that a `stamp` says, in seconds as `time_of_day` has them. Raises ValueError for anything else."""
    return calendar.timegm(time.strptime(stamped, STAMP))
