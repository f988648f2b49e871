"""Tempo beaten by hand: the steady line through the last taps."""

import numpy as np

from player.inputs.beat import Beat

MOST_TAPS = 8
LONGEST_S = 4.0
"""A longer pause begins anew."""

OFF = 1.5
"""So much longer or shorter than the taps before, and it is another tempo."""

SHORTEST_S = 0.06
"""Taps nearer together are one tap that bounced: 1000 counts a minute is the fastest tempo."""


class TapTempo:
    """Taps in, the running tempo out; each tap is a count, the first of a series is count 0."""

    def __init__(self) -> None:
        self._taps: list[float] = []
        self._first = 0

    def tap(self, at_s: float) -> Beat | None:
        """A tap; the tempo from the second of a series on."""
        taps = self._taps
        if taps:
            gap_s = at_s - taps[-1]
            if gap_s < SHORTEST_S:
                return self._beat()
            mean_s = (taps[-1] - taps[0]) / (len(taps) - 1) if len(taps) > 1 else gap_s
            if gap_s > LONGEST_S:
                taps.clear()
                self._first = 0
            elif not mean_s / OFF <= gap_s <= mean_s * OFF:
                del taps[:-1]
                self._first = 0
        taps.append(at_s)
        if len(taps) > MOST_TAPS:
            del taps[0]
            self._first += 1
        return self._beat()

    def _beat(self) -> Beat | None:
        if len(self._taps) < 2:
            return None
        times = np.array(self._taps) - self._taps[-1]
        counts = np.arange(len(times), dtype=float)
        slope, at_zero = np.polyfit(counts, times, 1)
        last = len(times) - 1
        return Beat(self._first + last, float(self._taps[-1] + at_zero + slope * last), float(1.0 / slope))
