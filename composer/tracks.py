"""Tracks: what every fiber is asked to do over time, as arrays. Checker, retimer, pictures and player all read these."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.quivers import NONE, Quivers

Array = NDArray[np.float64]

HOLD, MOVE, SUDDEN, STEP = 0, 1, 2, 3

SAME_INSTANT_S = 1e-9
"""Instants closer than this, in seconds, are one instant."""


@dataclass(frozen=True, slots=True, eq=False)
class Tracks:
    """One track a fiber, all in flat arrays of K knots; those of fiber f are `first[f]:first[f + 1]`.

    Segment k runs from knot k to knot k + 1 of the same fiber; the last knot of a fiber begins a hold without end.
    Every fiber has at least one knot, the first at 0 s; times never fall. No two holds follow one another.

    first: (F + 1,) int64
    time_s: (K,) seconds from the start of the score
    curve: (K, 6) strain along the segment as a polynomial in u, the share of its time gone, lowest power first
    manner: (K,) int8: HOLD (constant), MOVE (polynomial), SUDDEN (as fast as the fiber goes at each strain; `curve`
        is the straight line between its ends), STEP (no time at all: the strain jumps)
    shape: (K,) int8: index into `composer.shapes.NAMES` where a whole written shape stands, -1 for a sum or a cut
    line, phrase_line: (K,) int32: lines of the score that made the segment (0 for none): of the section's entry and of the
        phrase's line; where the phrase came from another file phrase_line is 0
    duration_s: the score's length, at least the last knot's time
    quivers: sines on top of `curve`; they lie over moves and jumps only: what holds and quivers is a move of a constant curve
    """

    first: NDArray[np.int64]
    time_s: Array
    curve: Array
    manner: NDArray[np.int8]
    shape: NDArray[np.int8]
    line: NDArray[np.int32]
    phrase_line: NDArray[np.int32]
    duration_s: float
    quivers: Quivers = NONE

    @property
    def fibers(self) -> int:
        """How many fibers."""
        return len(self.first) - 1

    @property
    def moves(self) -> int:
        """How many segments are no holds."""
        return int(np.count_nonzero(self.manner != HOLD))


def fiber_of(tracks: Tracks) -> NDArray[np.int64]:
    """The fiber of each knot, (K,)."""
    return np.repeat(np.arange(tracks.fibers), np.diff(tracks.first))


def durations(tracks: Tracks) -> Array:
    """Seconds that each segment lasts, (K,); 0 for the hold without end at the last knot of a fiber."""
    lasts = np.diff(tracks.time_s, append=tracks.time_s[-1:])
    lasts[tracks.first[1:] - 1] = 0.0
    return lasts


def end_strain(tracks: Tracks) -> Array:
    """Strain at the end of each segment, (K,)."""
    return tracks.curve.sum(axis=1)
