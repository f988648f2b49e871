"""A run as a cloth shows it: strain at many instants as tracks in which nothing lands."""

import numpy as np
from numpy.typing import NDArray

from composer.tracks import HOLD, Tracks

Array = NDArray[np.float64]

SAME = 1e-5
"""Share of the stroke by which a sample may lie off the line between its neighbours and be left out."""


def recorded(times_s: Array, strain: NDArray[np.floating], stroke: Array, duration_s: float) -> Tracks:
    """Tracks for a cloth alone: straight lines between samples `strain` (F, T) at `times_s` (T,), those that bend kept.

    Every segment counts as a hold, whatever its slope, as no move of a score ends there.
    """
    fibers, count = strain.shape
    times = np.concatenate([[0.0], times_s[times_s > 0.0]])
    values = np.column_stack([strain[:, :1], strain[:, times_s > 0.0]]).astype(float) if count else np.zeros((fibers, 1))
    keep = np.ones(values.shape, dtype=bool)
    if values.shape[1] > 2:
        # Samples are evenly apart but for the first, so a line bends where its second difference is not nothing.
        keep[:, 2:-1] = np.abs(np.diff(values, 2, axis=1))[:, 1:] > SAME * stroke[:, None]
    fiber, at = np.nonzero(keep)
    start = values[fiber, at]
    last = np.append(fiber[1:] != fiber[:-1], True)
    rise = np.where(last, 0.0, np.roll(start, -1) - start)
    knots = len(start)
    curve = np.zeros((knots, 6))
    curve[:, 0], curve[:, 1] = start, rise
    first = np.concatenate([[0], np.flatnonzero(last) + 1]).astype(np.int64)
    empty = np.zeros(knots, dtype=np.int32)
    return Tracks(
        first, times[at], curve, np.full(knots, HOLD, np.int8), np.full(knots, -1, np.int8), empty, empty.copy(),
        max(duration_s, float(times[-1])),
    )  # fmt: skip
