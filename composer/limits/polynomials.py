"""Many polynomials at once, over the unit interval: values, derivatives, roots, greatest and least values.

A polynomial is a row of coefficients, lowest power first, as in `Tracks.curve`.
"""

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

STEPS = 80
"""Most steps of a root search: each is at most half the one before, so that doubles run out of digits before steps do."""

FINE = 1e-15
"""A Newton step that is no longer than this, in u, is its last: the one after would be lost in rounding."""


def value(curve: Array, u: Array) -> Array:
    """Each row's value at `u`: curve (K, n) with u (K,) or (K, m) gives u's shape."""
    columns = curve.T[(...,) + (None,) * (u.ndim - 1)]
    if len(columns) == 1:
        return np.broadcast_to(columns[0], u.shape).copy()
    total = columns[-1] * u
    total += columns[-2]
    for coefficient in columns[-3::-1]:
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
    if terms < 4:
        quadratics = np.zeros((rows, 3))
        quadratics[:, :terms] = curve
        return _closed(quadratics)[:, : terms - 1]
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


def _closed(curve: Array) -> Array:
    """The roots of quadratics, and of lines, whose last coefficient is 0: (K, 2), with no difference of near-equals."""
    c, b, a = curve.T
    with np.errstate(divide="ignore", invalid="ignore"):
        q = -0.5 * (b + np.copysign(np.sqrt(b * b - 4.0 * a * c), b))
        pair = np.column_stack([q / a, c / q])
    inside = (pair > -FINE) & (pair < 1.0 + FINE)
    return np.sort(np.where(inside, np.clip(pair, 0.0, 1.0), np.nan), axis=1)


def search(curve: Array, low: Array, high: Array, at_low: Array) -> Array:
    """The root of each row between `low` and `high`, between which it changes sign; `at_low` its value at low.

    Newton's method, kept between the ends of what still holds the root; where a step would leave them, or is more than half of
    the step before (a root that is nearly touched), the middle is taken instead (Press et al., Numerical Recipes, 9.4).
    """
    noise = np.finfo(float).eps * np.abs(curve).sum(axis=1)  # below which a value says nothing of its sign
    first, last = np.abs(at_low) <= noise, np.abs(value(curve, high)) <= noise
    found = np.where(first, low, np.where(last, high, 0.5 * (low + high)))
    left = np.flatnonzero(~(first | last))
    if not len(left):
        return found
    rows, low, high, sign, u, noise = curve[left], low[left], high[left], np.sign(at_low[left]), found[left], noise[left]
    slope, last = derivative(rows), high - low
    for _ in range(STEPS):
        height = value(rows, u)
        before = np.sign(height) == sign
        low, high = np.where(before, u, low), np.where(before, high, u)
        with np.errstate(divide="ignore", invalid="ignore"):
            newton = u - height / value(slope, u)
            # A root at an end of the bracket may, in rounding, lie a little outside: no reason to begin again in its middle.
            good = (newton > low - FINE) & (newton < high + FINE) & (2.0 * np.abs(newton - u) <= last)
            newton = np.clip(newton, low, high)
            there = (np.abs(height) <= noise) | (np.abs(newton - u) <= FINE)
        following = np.where(there, u, np.where(good, newton, 0.5 * (low + high)))
        last = np.abs(following - u)
        done = there | (high - low <= FINE)
        u = following
        if done.any():
            found[left[done]] = u[done]
            left, go = left[~done], ~done
            if not len(left):
                return found
            rows, slope, noise, last = rows[go], slope[go], noise[go], last[go]
            low, high, sign, u = low[go], high[go], sign[go], u[go]
    found[left] = u
    return found


def where_positive(curve: Array, one_way: NDArray[np.bool_] | None = None) -> tuple[NDArray[np.int64], Array, Array]:
    """The stretches of u on which each row is above 0: rows, u from, u to, (P,) each, in order of row and then of u.

    one_way: (K,) rows known to rise throughout, or to fall: they have one root at most, and no turn need be looked for.
    """
    if one_way is None or not one_way.any():
        cuts = roots(curve)
    else:
        cuts = np.full((len(curve), max(curve.shape[1] - 1, 1)), np.nan)
        mine, others = np.flatnonzero(one_way), np.flatnonzero(~one_way)
        cuts[others, : curve.shape[1] - 1] = roots(curve[others])
        begin, end = curve[mine, 0], curve[mine].sum(axis=1)
        crossing = np.flatnonzero((begin > 0.0) != (end > 0.0))
        at = mine[crossing]
        cuts[at, 0] = search(curve[at], np.zeros(len(at)), np.ones(len(at)), begin[crossing])
    cuts = np.column_stack([np.zeros(len(curve)), cuts, np.ones(len(curve))])
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
