"""Many polynomials at once, over the unit interval: values, derivatives, roots, greatest and least values.

A polynomial is a row of coefficients, lowest power first, as in `Tracks.curve`.
"""

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

STEPS = 80
"""Most steps of a root search: every second one halves the bracket, so that doubles run out of digits before steps do."""


def value(curve: Array, u: Array) -> Array:
    """Each row's value at `u`: curve (K, n) with u (K,) or (K, m) gives u's shape."""
    columns = curve.T[(...,) + (None,) * (u.ndim - 1)]
    total = np.broadcast_to(columns[-1], u.shape).copy()
    for coefficient in columns[-2::-1]:
        total *= u
        total += coefficient
    return total


def derivative(curve: Array) -> Array:
    """The coefficients of each row's derivative by u, (K, n - 1)."""
    return curve[:, 1:] * np.arange(1, curve.shape[1])


def roots(curve: Array) -> Array:
    """Each row's roots in [0, 1] where it changes sign, rising, nan where it has fewer: (K, n - 1) for curve (K, n).

    The roots of the derivative cut the interval into stretches on which a polynomial rises or falls throughout, so each
    holds one root at most; a bracketed Newton search finds it to the last digit, and no coefficient need differ from 0.
    A root that is touched and not crossed is found or not as rounding will have it.
    """
    rows, terms = curve.shape
    if terms < 2:
        return np.empty((rows, 0))
    cuts = np.column_stack([np.zeros(rows), roots(derivative(curve)), np.ones(rows)])
    # A missing cut becomes an empty stretch at the end: order is kept, and empty stretches hold no change of sign.
    cuts = np.where(np.isnan(cuts), 1.0, cuts)
    heights = value(curve, cuts)
    found = np.full((rows, terms - 1), np.nan)
    left, right = heights[:, :-1], heights[:, 1:]
    row, stretch = np.nonzero((np.sign(left) * np.sign(right) < 0.0) | ((left == 0.0) & (right != 0.0)))
    if len(row):
        found[row, stretch] = search(curve[row], cuts[row, stretch], cuts[row, stretch + 1], left[row, stretch])
    ends = (heights[:, -1] == 0.0) & np.any(heights != 0.0, axis=1) & np.all(~(found == 1.0), axis=1)
    found[ends, -1] = np.where(np.isnan(found[ends, -1]), 1.0, found[ends, -1])
    return np.sort(found, axis=1)


def search(curve: Array, low: Array, high: Array, at_low: Array) -> Array:
    """The root of each row between `low` and `high`, between which it changes sign; `at_low` its value at low."""
    slope = derivative(curve)
    low, high = low.copy(), high.copy()
    sign = np.sign(at_low)
    u = np.where(at_low == 0.0, low, 0.5 * (low + high))
    left = np.flatnonzero(at_low != 0.0)
    for step in range(STEPS):
        if not len(left):
            break
        at, height = u[left], value(curve[left], u[left])
        before = np.sign(height) == sign[left]
        low[left] = np.where(before, at, low[left])
        high[left] = np.where(before, high[left], at)
        middle = 0.5 * (low[left] + high[left])
        with np.errstate(divide="ignore", invalid="ignore"):
            newton = at - height / value(slope[left], at)
        inside = (newton > low[left]) & (newton < high[left])
        # Newton closes in from one side only; a halving now and then keeps the bracket shrinking on rows where it stalls.
        following = np.where(inside & (step % 4 != 3), newton, middle)
        done = (height == 0.0) | (np.abs(following - at) <= 1e-16 + 2e-16 * at) | (middle <= low[left]) | (middle >= high[left])
        u[left] = np.where(height == 0.0, at, following)
        left = left[~done]
    return u


def where_positive(curve: Array) -> tuple[NDArray[np.int64], Array, Array]:
    """The stretches of u on which each row is above 0: rows, u from, u to, (P,) each, in order of row and then of u."""
    cuts = np.column_stack([np.zeros(len(curve)), roots(curve), np.ones(len(curve))])
    cuts = np.where(np.isnan(cuts), 1.0, cuts)
    middles = value(curve, 0.5 * (cuts[:, :-1] + cuts[:, 1:]))
    row, stretch = np.nonzero((middles > 0.0) & (cuts[:, 1:] > cuts[:, :-1]))
    return row, cuts[row, stretch], cuts[row, stretch + 1]


def extremes(curve: Array) -> tuple[Array, Array]:
    """Each row's least and greatest value over [0, 1], two of (K,)."""
    if curve.shape[1] == 1:
        return curve[:, 0], curve[:, 0]
    if not len(curve):
        return np.empty(0), np.empty(0)
    at = np.column_stack([np.zeros(len(curve)), roots(derivative(curve)), np.ones(len(curve))])
    heights = value(curve, np.where(np.isnan(at), 0.0, at))
    return heights.min(axis=1), heights.max(axis=1)
