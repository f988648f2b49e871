"""Rate tables: how fast a fiber goes at each strain, how long a way takes it, and how far it comes in a given time.

A fastest rate is linear in strain between the points of its table and holds its end value beyond them. In a cell that
starts at strain s0 with rate r0 and slope k, the way to s takes ln(1 + k (s - s0) / r0) / k, and after a time t the strain
is s0 + r0 (exp(k t) - 1) / k; both are written so that a slope of 0 is no special case and a small one loses nothing.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.limits.abilities import Abilities

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class OneWay:
    """The rates of one direction, all A capabilities with n points each, flattened so that one search serves all.

    strain, rate: (A * n,) the tables end to end
    slope: (A * n,) change of rate over strain in the cell that begins at a point, 0 at a table's last
    clock_s: (A * n,) seconds from the table's first strain to each point at the fastest rate
    """

    strain: Array
    rate: Array
    slope: Array
    clock_s: Array


@dataclass(frozen=True, slots=True, eq=False)
class Tables:
    """Both directions' tables, and the keys by which a strain or a clock finds its cell.

    stroke_key: (A * n,) where each point lies in its table, 0 to 1, plus twice its capability's number: rising throughout
    fill_key, exhaust_key: the same for the clocks
    """

    points: int
    low: Array
    width: Array
    stroke_key: Array
    fill: OneWay
    exhaust: OneWay
    fill_key: Array
    exhaust_key: Array


@lru_cache(maxsize=8)
def tables_of(abilities: Abilities) -> Tables:
    """The prepared tables of some abilities; kept for the abilities last used, as the same few are asked for again."""
    strain = abilities.strain
    count, points = strain.shape
    low, width = strain[:, :1], strain[:, -1:] - strain[:, :1]
    number = 2.0 * np.arange(count)[:, None]
    fill, exhaust = _one_way(strain, abilities.fill), _one_way(strain, abilities.exhaust)

    def keys(way: OneWay) -> Array:
        clock = way.clock_s.reshape(count, points)
        return (clock / clock[:, -1:] + number).ravel()

    return Tables(
        points=points,
        low=low[:, 0],
        width=width[:, 0],
        stroke_key=((strain - low) / width + number).ravel(),
        fill=fill,
        exhaust=exhaust,
        fill_key=keys(fill),
        exhaust_key=keys(exhaust),
    )


def _one_way(strain: Array, rate: Array) -> OneWay:
    """One direction's rates with slopes and clocks."""
    step, rise = np.diff(strain, axis=1), np.diff(rate, axis=1)
    clock = np.zeros_like(strain)
    np.cumsum(step / rate[:, :-1] * _log_ratio(rise / rate[:, :-1]), axis=1, out=clock[:, 1:])
    slope = np.zeros_like(strain)
    slope[:, :-1] = rise / step
    return OneWay(strain.ravel(), rate.ravel(), slope.ravel(), clock.ravel())


def _log_ratio(x: Array) -> Array:
    """ln(1 + x) / x, which is 1 at 0."""
    return np.divide(np.log1p(x), x, out=np.ones(np.shape(x)), where=x != 0.0)


def _exp_ratio(x: Array) -> Array:
    """(exp(x) - 1) / x, which is 1 at 0."""
    safe = np.where(x == 0.0, 1.0, x)
    return np.where(x == 0.0, 1.0, np.expm1(safe) / safe)


def _cell(keys: Array, points: int, capability: Index, share: Array) -> Index:
    """The flat index of the point that begins the cell in which `share` of a capability's table lies."""
    first = capability * points
    found = np.searchsorted(keys, np.minimum(np.maximum(share, 0.0), 1.0) + 2.0 * capability, side="right") - 1
    return np.minimum(np.maximum(found, first), first + points - 2)


def cells(abilities: Abilities, fiber: Index, strain: Array) -> Index:
    """The flat index of the table point at or below each strain (within its fiber's table), any one shape."""
    tables = tables_of(abilities)
    capability = abilities.which[fiber]
    share = (strain - tables.low[capability]) / tables.width[capability]
    return _cell(tables.stroke_key, tables.points, capability, share)


def rates(abilities: Abilities, fiber: Index, strain: Array, rising: NDArray[np.bool_], cell: Index | None = None) -> Array:
    """The fastest rate in 1/s of each fiber at each strain, filling where `rising`, exhausting elsewhere; any one shape.

    Beyond a table's ends its end value holds. cell: what `cells` gave for these strains, where that is known already.
    """
    tables = tables_of(abilities)
    first = abilities.which[fiber] * tables.points
    at = cells(abilities, fiber, strain) if cell is None else cell
    held = np.clip(strain, tables.fill.strain[first], tables.fill.strain[first + tables.points - 1]) - tables.fill.strain[at]
    up = tables.fill.rate[at] + tables.fill.slope[at] * held
    down = tables.exhaust.rate[at] + tables.exhaust.slope[at] * held
    return np.where(rising, up, down)


def slowest_rates(abilities: Abilities, fiber: Index, low: Array, high: Array) -> tuple[Array, Array]:
    """The least fill and the least exhaust rate in 1/s anywhere between two strains, low to high, (K,) each, exact.

    A rate that is linear in pieces is least at an end or at a point of its table between them; the least over any run of
    points is the lesser of two runs of a power of two, which are worked out once.
    """
    first, last = cells(abilities, fiber, low) + 1, cells(abilities, fiber, high)
    some = last >= first
    level = np.where(some, np.frexp(np.maximum(last - first + 1, 1))[1] - 1, 0)
    least = []
    for rising, runs in zip((True, False), _least_of_runs(abilities), strict=True):
        way = np.full(len(low), rising)
        ends = np.minimum(rates(abilities, fiber, low, way), rates(abilities, fiber, high, way))
        begin, end = np.where(some, first, 0), np.where(some, last - (1 << level) + 1, 0)
        between = np.minimum(runs[level, begin], runs[level, end])
        least.append(np.where(some, np.minimum(ends, between), ends))
    return least[0], least[1]


@lru_cache(maxsize=8)
def _least_of_runs(abilities: Abilities) -> tuple[Array, Array]:
    """For fill and exhaust, the least rate of the 2^level points from each point on: (levels, A * n)."""
    tables = tables_of(abilities)
    both = []
    for way in (tables.fill, tables.exhaust):
        runs = [way.rate]
        while (half := 1 << (len(runs) - 1)) < tables.points:
            ahead = np.concatenate([runs[-1][half:], np.full(half, np.inf)])
            runs.append(np.minimum(runs[-1], ahead))
        both.append(np.array(runs))
    return both[0], both[1]


def travel_time_s(abilities: Abilities, fiber: ArrayLike, a: ArrayLike, b: ArrayLike) -> Array:
    """Seconds that each fiber takes from strain `a` to strain `b` at its fastest rate at every strain on the way.

    fiber, a, b: equal-length arrays, (K,). The integral of d(strain) / rate, exact for rates linear between the points.
    """
    fiber, a, b = _three(fiber, a, b)
    tables = tables_of(abilities)
    rising = b > a
    if not np.count_nonzero(rising):
        return _way_time(abilities, tables, tables.exhaust, fiber, b, a)
    time = np.empty(len(a))
    for way, mine in ((tables.fill, rising), (tables.exhaust, ~rising)):
        if mine.any():
            time[mine] = _way_time(abilities, tables, way, fiber[mine], np.minimum(a, b)[mine], np.maximum(a, b)[mine])
    return time


def strain_after(abilities: Abilities, fiber: ArrayLike, a: ArrayLike, b: ArrayLike, elapsed_s: ArrayLike) -> Array:
    """Strain reached `elapsed_s` seconds after a fiber left `a` for `b` as fast as it goes; `b` once it has arrived.

    fiber, a, b, elapsed_s: equal-length arrays, (K,).
    """
    fiber, a, b = _three(fiber, a, b)
    elapsed = np.maximum(np.asarray(elapsed_s, dtype=float), 0.0)
    tables = tables_of(abilities)
    reached = b.copy()
    under_way = elapsed < travel_time_s(abilities, fiber, a, b)
    for way, keys, sign, mine in (
        (tables.fill, tables.fill_key, 1.0, under_way & (b > a)),
        (tables.exhaust, tables.exhaust_key, -1.0, under_way & (b <= a)),
    ):
        if mine.any():
            capability = abilities.which[fiber[mine]]
            now = _clock(tables, way, capability, a[mine], cells(abilities, fiber[mine], a[mine])) + sign * elapsed[mine]
            there = _at_clock(tables, way, keys, capability, now)
            reached[mine] = np.clip(there, np.minimum(a, b)[mine], np.maximum(a, b)[mine])
    return np.where(elapsed == 0.0, a, reached)


def _three(fiber: ArrayLike, a: ArrayLike, b: ArrayLike) -> tuple[Index, Array, Array]:
    fiber, a, b = np.asarray(fiber, dtype=np.int64), np.asarray(a, float), np.asarray(b, float)
    if fiber.shape == a.shape == b.shape:
        return fiber, a, b
    fiber, a, b = np.broadcast_arrays(fiber, a, b)
    return fiber, a, b


def _way_time(abilities: Abilities, tables: Tables, way: OneWay, fiber: Index, low: Array, high: Array) -> Array:
    """Seconds between two strains, low to high, by one direction's rates."""
    capability = abilities.which[fiber]
    # Both ends at once: most calls are of a few ways, and cost what their steps cost.
    number, both = len(low), np.concatenate([capability, capability])
    ends = np.concatenate([low, high])
    share = (ends - tables.low[both]) / tables.width[both]
    cell = _cell(tables.stroke_key, tables.points, both, share)
    clock = _clock(tables, way, both, ends, cell)
    time = clock[number:] - clock[:number]
    first_cell, last_cell = cell[:number], cell[number:]
    # Within one cell the difference of two clocks would lose a short way's digits.
    begin = capability * tables.points
    inside = (first_cell == last_cell) & (low >= way.strain[begin]) & (high <= way.strain[begin + tables.points - 1])
    inside = inside.nonzero()[0]
    if not inside.size:
        return time
    cell, low, high = first_cell[inside], low[inside], high[inside]
    rate = way.rate[cell] + way.slope[cell] * (low - way.strain[cell])
    time[inside] = (high - low) / rate * _log_ratio(way.slope[cell] * (high - low) / rate)
    return time


def _clock(tables: Tables, way: OneWay, capability: Index, strain: Array, cell: Index) -> Array:
    """Seconds from the table's first strain to each strain; below it negative."""
    first = capability * tables.points
    last = first + tables.points - 1
    over, under = strain > way.strain[last], strain < way.strain[first]
    some = np.count_nonzero(over | under)
    gone = (np.clip(strain, way.strain[first], way.strain[last]) if some else strain) - way.strain[cell]
    clock = way.clock_s[cell] + gone / way.rate[cell] * _log_ratio(way.slope[cell] * gone / way.rate[cell])
    if not some:
        return clock
    clock = np.where(over, way.clock_s[last] + (strain - way.strain[last]) / way.rate[last], clock)
    return np.where(under, (strain - way.strain[first]) / way.rate[first], clock)


def _at_clock(tables: Tables, way: OneWay, keys: Array, capability: Index, clock: Array) -> Array:
    """The strain at which a clock stands: the inverse of `_clock`."""
    first = capability * tables.points
    last = first + tables.points - 1
    total = way.clock_s[last]
    cell = _cell(keys, tables.points, capability, clock / total)
    gone = np.clip(clock, 0.0, total) - way.clock_s[cell]
    strain = way.strain[cell] + way.rate[cell] * gone * _exp_ratio(way.slope[cell] * gone)
    strain = np.where(clock > total, way.strain[last] + (clock - total) * way.rate[last], strain)
    return np.where(clock < 0.0, way.strain[first] + clock * way.rate[first], strain)
