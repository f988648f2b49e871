"""Shrinking the moves between pins that are too close, by the largest factor with which they fit."""

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.quivers import pairs
from composer.retime.pins import Chain
from composer.shapes import PROGRESS
from composer.tracks import HOLD, MOVE, Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

MARGIN = 1e-9
"""How much of the time there is a shrunk chain leaves, so that rounding cannot make it short again."""


@dataclass(frozen=True, slots=True)
class Shrunk:
    """A move that was shrunk about the value that its chain starts from: `knot` its segment, `factor` what is left of it."""

    fiber: int
    knot: int
    factor: float


def factor_that_fits(tracks: Tracks, chain: Chain, least_s: Callable[[Tracks, Index], Array]) -> float:
    """The largest share of their displacement, 0 to 1, with which the chain's moves fit the time they have.

    least_s: least durations of some segments of some tracks. Bisection, as the sum of least durations rises with the
    factor; 0 where even moves that go nowhere would not fit.
    """
    knots = np.array(chain.knots, dtype=np.int64)
    if not len(knots):
        return 0.0
    whole = float(least_s(tracks, knots).sum())
    room = (whole - chain.short_s) * (1.0 - MARGIN)

    def fits(factor: float) -> bool:
        return float(least_s(scaled(tracks, knots, factor), knots).sum()) <= room

    low, high = 0.0, 1.0
    if not fits(low):
        return 0.0
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if fits(middle) else (low, middle)
        if high - low <= 1e-12:
            break
    return low


def scaled(tracks: Tracks, knots: Index, factor: float) -> Tracks:
    """Tracks in which the moves `knots` go `factor` of their way, counted from where their fiber's first one starts.

    Holds that follow keep the new value; moves that follow go to their own targets from there. A quiver shrinks with the moves
    that it lies over, and keeps its frequency.
    """
    curve = tracks.curve.copy()
    fiber = fiber_of(tracks)
    chosen = np.zeros(len(fiber), dtype=bool)
    chosen[knots] = True
    still = (tracks.manner == HOLD) | ((tracks.manner == MOVE) & np.all(tracks.curve[:, 1:] == 0.0, axis=1))
    for one in np.unique(fiber[knots]):
        mine = knots[fiber[knots] == one]
        base = tracks.curve[mine.min(), 0]
        carried: float | None = None
        for k in range(int(mine.min()), int(tracks.first[one + 1])):
            if chosen[k]:
                curve[k] = factor * tracks.curve[k]
                curve[k, 0] += (1.0 - factor) * base
            elif carried is None:
                break
            elif still[k]:
                curve[k, 0] = carried
            else:
                curve[k] = _from(tracks.curve[k], carried)
            carried = float(curve[k].sum())
            if k > mine.max() and not still[k]:
                break
    segment, which = pairs(tracks.quivers)
    amplitude = tracks.quivers.amplitude.copy()
    amplitude[which[chosen[segment]]] = factor * tracks.quivers.amplitude[which[chosen[segment]]]
    return replace(tracks, curve=curve, quivers=replace(tracks.quivers, amplitude=amplitude))


def _from(curve: Array, start: float) -> Array:
    """A move that starts from elsewhere and still goes to its own target, in its own manner where it has a way to go."""
    begin, end = curve[0], curve.sum()
    way = end - begin
    # Where the move as written is too small to stretch, the quiet shape takes the difference away.
    if abs(way) > 1e-3 * max(abs(end - start), 1e-12) and np.sign(way) != 0:
        moved = curve * ((end - start) / way)
        moved[0] = start
        return moved
    moved = curve - (start - begin) * PROGRESS["smooth"]
    moved[0] = start
    return moved
