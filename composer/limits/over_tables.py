"""The least duration of any polynomial over any rate table: the greatest of |s'(u)| / rate(s(u)) for u from 0 to 1.

The quotient is smooth but where the strain passes a point of the table. It is sampled; then every passage that could be
worse than the worst sample is found exactly, and every peak close to the worst is closed in on by golden section.
"""

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.polynomials import derivative, search, value
from composer.limits.tables import cells, rates, tables_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

SAMPLES = 65
"""Samples of u: a peak of the minimum-jerk profile lies at most 5e-4 of itself above one of them."""

CLOSE = 0.98
"""Peaks of at least this share of the worst sample are closed in on; what lies between samples exceeds them by far less."""

ROWS = 8192
"""Rows worked out at a time, so that memory does not grow with the score."""

GOLDEN = 0.5 * (np.sqrt(5.0) - 1.0)
GOLDEN_STEPS = 24


def durations_over_tables(abilities: Abilities, fiber: Index, curve: Array) -> Array:
    """Least seconds for each move, (K,), within 1e-4 of itself, by the rates of its fiber alone (no acceleration limit).

    fiber: (K,); curve: (K, 6) strain as polynomials in the share of time gone. Each direction by its own rates.
    """
    return worst_over_tables(abilities, fiber, curve)[0]


def worst_over_tables(abilities: Abilities, fiber: Index, curve: Array) -> tuple[Array, Array]:
    """As `durations_over_tables`, with the share of its time at which each move asks the most: two of (K,)."""
    worst, at = np.zeros(len(fiber)), np.zeros(len(fiber))
    for begin in range(0, len(fiber), ROWS):
        part = slice(begin, begin + ROWS)
        worst[part], at[part] = _worst(abilities, fiber[part], curve[part])
    return worst, at


def _worst(abilities: Abilities, fiber: Index, curve: Array) -> tuple[Array, Array]:
    u = np.linspace(0.0, 1.0, SAMPLES)
    speed_curve = derivative(curve)
    strain = curve @ np.vander(u, curve.shape[1], increasing=True).T
    speed = speed_curve @ np.vander(u, speed_curve.shape[1], increasing=True).T
    fibers = np.broadcast_to(fiber[:, None], strain.shape)
    cell = cells(abilities, fibers, strain)
    asked = np.abs(speed) / rates(abilities, fibers, strain, speed > 0.0, cell)
    at = u[asked.argmax(axis=1)]
    worst = asked.max(axis=1)
    _raise(worst, at, *_at_points(abilities, fiber, curve, speed, cell, worst))

    padded = np.pad(asked, ((0, 0), (1, 1)), constant_values=-1.0)
    peak = (asked >= padded[:, :-2]) & (asked >= padded[:, 2:]) & (asked >= CLOSE * worst[:, None]) & (asked > 0.0)
    row, sample = np.nonzero(peak)
    low, high = u[np.maximum(sample - 1, 0)], u[np.minimum(sample + 1, SAMPLES - 1)]
    _raise(worst, at, row, *_golden(abilities, fiber[row], curve[row], speed_curve[row], low, high))
    return worst, at


def _raise(worst: Array, at: Array, row: Index, asked: Array, u: Array) -> None:
    """Put what was `asked` of some rows at `u` in place of what was known, where it is more."""
    np.maximum.at(worst, row, asked)
    mine = asked == worst[row]
    at[row[mine]] = u[mine]


def _at_points(
    abilities: Abilities, fiber: Index, curve: Array, speed: Array, cell: Index, worst: Array
) -> tuple[Index, Array, Array]:
    """What is asked where a strain passes a point of its table, for passages that may be the worst: rows, values, u."""
    tables = tables_of(abilities)
    passed = np.abs(np.diff(cell, axis=1))
    row, stretch = np.nonzero(passed)
    count = passed[row, stretch]
    row, stretch = np.repeat(row, count), np.repeat(stretch, count)
    which = np.arange(len(row)) - np.repeat(np.cumsum(count) - count, count)
    point = np.minimum(cell[row, stretch], cell[row, stretch + 1]) + 1 + which
    rising = cell[row, stretch + 1] > cell[row, stretch]
    steepest = np.maximum(np.abs(speed[row, stretch]), np.abs(speed[row, stretch + 1])) / CLOSE
    rate = np.where(rising, tables.fill.rate[point], tables.exhaust.rate[point])
    chosen = steepest / rate > worst[row]
    row, stretch, point, rate = row[chosen], stretch[chosen], point[chosen], rate[chosen]
    if not len(row):
        return row, np.empty(0), np.empty(0)
    shifted = curve[row].copy()
    shifted[:, 0] -= tables.fill.strain[point]
    low, high = stretch / (SAMPLES - 1.0), (stretch + 1) / (SAMPLES - 1.0)
    u = search(shifted, low, high, value(shifted, low))
    return row, np.abs(value(derivative(shifted), u)) / rate, u


def _golden(
    abilities: Abilities, fiber: Index, curve: Array, speed_curve: Array, low: Array, high: Array
) -> tuple[Array, Array]:
    """The greatest quotient met in closing in on the peak of each row between `low` and `high`, and where: two of (K,)."""

    def asked(u: Array) -> Array:
        speed = value(speed_curve, u)
        return np.abs(speed) / rates(abilities, fiber, value(curve, u), speed > 0.0)

    left, right = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
    at_left, at_right = asked(left), asked(right)
    best = np.maximum(at_left, at_right)
    where = np.where(at_left > at_right, left, right)
    for _ in range(GOLDEN_STEPS):
        lower = at_left > at_right
        low, high = np.where(lower, low, left), np.where(lower, right, high)
        fresh = np.where(lower, high - GOLDEN * (high - low), low + GOLDEN * (high - low))
        at_fresh = asked(fresh)
        left, right = np.where(lower, fresh, right), np.where(lower, left, fresh)
        at_left, at_right = np.where(lower, at_fresh, at_right), np.where(lower, at_left, at_fresh)
        where = np.where(at_fresh > best, fresh, where)
        best = np.maximum(best, at_fresh)
    return best, where
