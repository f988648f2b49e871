"""When messages really came in: the backend's own intervals, laid onto the steady clock."""

DRIFT = 1e-4
"""How much faster or slower the backend's clock may run."""

AFRESH_S = 0.05
"""Farther off than that, and the intervals do not tell the truth: begin anew."""


class Stamps:
    """Moments from arrival times and the intervals that a backend gives.

    A message arrives late by what the threads between took, never early. So the least lateness of the recent past is taken
    to be none, and every message is placed by its interval from the one before: what came in one block keeps its distances.
    """

    def __init__(self) -> None:
        self._ran_s = 0.0
        self._offset_s: float | None = None

    def at(self, arrived_s: float, interval_s: float) -> float:
        """The moment of a message that arrived at `arrived_s`, `interval_s` after the one before by the backend's clock."""
        if not 0.0 <= interval_s < 3600.0:
            interval_s = 0.0
        self._ran_s += interval_s
        now = arrived_s - self._ran_s
        if self._offset_s is None or abs(now - self._offset_s) > AFRESH_S:
            self._offset_s = now
        else:
            self._offset_s = min(now, self._offset_s + DRIFT * interval_s)
        return self._ran_s + self._offset_s
