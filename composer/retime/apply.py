"""New tracks from new times."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from composer.tracks import SAME_INSTANT_S, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def retimed(tracks: Tracks, origin: Index, time_s: Array, duration_s: float) -> Tracks:
    """Prepared tracks with other times, (K',), less the waits put in that were not needed.

    origin: (K',) as `with_waits` gives it; a wait that has come to nothing leaves the tracks as they were written.
    """
    put_in = np.flatnonzero(np.append(origin[1:] == origin[:-1], False))
    idle = put_in[time_s[put_in + 1] - time_s[put_in] <= SAME_INSTANT_S]
    keep = np.ones(len(origin), dtype=bool)
    keep[idle] = False
    times = time_s.copy()
    # The move takes over the knot, and with it the arrival, of the wait that goes.
    times[idle + 1] = times[idle]
    place = np.cumsum(keep) - keep
    return replace(
        tracks,
        first=tracks.first - np.searchsorted(idle, tracks.first, side="left"),
        time_s=times[keep],
        curve=tracks.curve[keep],
        manner=tracks.manner[keep],
        shape=tracks.shape[keep],
        line=tracks.line[keep],
        phrase_line=tracks.phrase_line[keep],
        duration_s=duration_s,
        quivers=replace(tracks.quivers, knot=place[tracks.quivers.knot], until=place[tracks.quivers.until]),
    )
