"""When messages really came in: the backend's own intervals, laid onto the steady clock."""

DRIFT = 1e-4
"""How much faster or slower the backend's clock may run."""

AFRESH_S = 0.25
"""Later than it can have waited, by so much, and the intervals do not tell the truth: begin anew."""


class Stamps:
    """Moments from the times at which messages were read and the intervals that a backend gives.

    A message is read late by what it waited, never early. So the least lateness of the recent past is taken to be none, and
    every message is placed by its interval from the one before: what is read in one go keeps its distances.
    """

    def __init__(self) -> None:
        self._ran_s = 0.0
        self._offset_s: float | None = None

    def at(self, read_s: float, interval_s: float, waited_s: float = 0.0) -> float:
        """The moment of a message that was read at `read_s`, `interval_s` after the one before by the backend's clock.

        waited_s: how long nothing had been read, the longest that it can have waited
        """
        if not 0.0 <= interval_s < 3600.0:
            interval_s = 0.0
        self._ran_s += interval_s
        now = read_s - self._ran_s
        if self._offset_s is None or now - self._offset_s > waited_s + AFRESH_S:
            self._offset_s = now
        else:
            self._offset_s = min(now, self._offset_s + DRIFT * interval_s)
        return self._ran_s + self._offset_s
