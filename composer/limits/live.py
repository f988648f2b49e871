"""The limits tick by tick: what every fiber can do from where it is, looked up for all fibers at once.

What is sent is a straight line of strain from one tick to the next, and a straight line is in order only if its rate is
below the fiber's rate everywhere on the way. From a strain s on, no rate within reach of one tick lies below
r(s) - K (s' - s), K the steepest fall within that reach; so the longest step d with d <= dt (r(s) - K d) is
d = dt r(s) / (1 + K dt). That needs no walk through the table, and gives away a part of a step of the order of K dt.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.tables import cells

Array = NDArray[np.float64]
Index = NDArray[np.int64]

LINES = 4
"""Columns that are lines in strain: fill rate, exhaust rate, air, way back."""


@dataclass(frozen=True, slots=True, eq=False)
class Live:
    """The tables of some abilities made ready for ticks of at most `longest_s`.

    columns: (14, A * n) for each point of each capability's table: the values there of the four lines, their slopes in the
        cell that begins there, then the strain of the point and the five worst values within reach
    first, per_strain: (F,) index of each fiber's first point, points for a strain of 1; per_strain is None where the points
        of a table do not lie evenly
    steady: whether no rate falls anywhere, so that a step is as long as its rate says
    """

    abilities: Abilities
    longest_s: float
    columns: Array
    first: Index
    last_cell: int
    per_strain: Array | None
    steady: bool


@dataclass(frozen=True, slots=True, eq=False)
class Look:
    """What F fibers can do where they are, (F,) each.

    fill, exhaust: fastest rates in 1/s; fill_falls, exhaust_falls: how steeply they fall, at most, within a tick's reach, 1/s
    air: litres drawn from rest up to here; air_up: at most so many litres for a strain of 1 within reach
    back: seconds that the way to rest takes at most, in ticks of any length; back_up: at most so much more for a strain of 1
        upwards within reach; back_down: at least so much less for a strain of 1 downwards
    """

    fill: Array
    exhaust: Array
    air: Array
    back: Array
    fill_falls: Array
    exhaust_falls: Array
    air_up: Array
    back_up: Array
    back_down: Array


def live(abilities: Abilities, longest_s: float) -> Live:
    """Make abilities ready for ticks of at most `longest_s` seconds.

    A fiber with a limit of acceleration is given the least rate of its table at every strain, so that braking never has to
    look ahead of what the table says; only rated fibers have such a limit, and their rates are constant.
    """
    strain, fill, exhaust = abilities.strain, abilities.fill.copy(), abilities.exhaust.copy()
    braced = np.zeros(len(strain), dtype=bool)
    braced[abilities.which[np.isfinite(abilities.accel)]] = True
    fill[braced] = fill[braced].min(axis=1, keepdims=True)
    exhaust[braced] = exhaust[braced].min(axis=1, keepdims=True)

    step = np.diff(strain, axis=1)
    rises, eases, draws = (np.diff(x, axis=1) / step for x in (fill, exhaust, abilities.air_L))
    high, low = strain[:, 1:], strain[:, :-1]
    above = high + longest_s * np.maximum(fill[:, 1:], fill[:, :-1])
    below = low - longest_s * np.maximum(exhaust[:, 1:], exhaust[:, :-1])
    fill_falls = np.maximum(_most_above(-rises, low, above), 0.0)
    exhaust_falls = np.maximum(_most_above(eases[:, ::-1], -high[:, ::-1], -below[:, ::-1])[:, ::-1], 0.0)
    air_up = _most_above(draws, low, above)
    # A brace reaches as far as it takes to stop, which may be further than a tick: everywhere the worst of the table.
    air_up[braced] = draws[braced].max(axis=1, keepdims=True)
    # Every step of a full exhaust that passes through a cell starts in it or within the longest step above it.
    slowest = np.minimum(exhaust[:, 1:], exhaust[:, :-1]) / (1.0 + exhaust_falls * longest_s)
    slowest_here = -_most_above(-slowest, low, high + longest_s * exhaust.max(axis=1, keepdims=True))
    each_back = 1.0 / slowest_here
    back = np.concatenate([np.zeros((len(strain), 1)), np.cumsum(step * each_back, axis=1)], axis=1)
    columns = [fill, exhaust, abilities.air_L, back, rises, eases, draws, each_back, strain]
    least_below = -_most_above(-each_back[:, ::-1], -high[:, ::-1], -below[:, ::-1])[:, ::-1]
    columns += [fill_falls, exhaust_falls, air_up, _most_above(each_back, low, above), least_below]
    points = strain.shape[1]
    full = [c if c.shape[1] == points else np.pad(c, ((0, 0), (0, 1)), mode="edge") for c in columns]
    even = np.ptp(step, axis=1) <= 1e-9 * step.mean(axis=1)
    return Live(
        abilities=abilities,
        longest_s=longest_s,
        columns=np.array([c.ravel() for c in full]),
        first=abilities.which * points,
        last_cell=points - 2,
        per_strain=(1.0 / step.mean(axis=1))[abilities.which] if even.all() else None,
        steady=not (fill_falls.any() or exhaust_falls.any()),
    )


def look(tables: Live, strain: Array) -> Look:
    """What every fiber can do at its strain, (F,) within [0, stroke]."""
    if tables.per_strain is None:
        at = cells(tables.abilities, np.arange(len(strain)), strain)
    else:
        at = (strain * tables.per_strain).astype(np.int64)
        np.minimum(at, tables.last_cell, out=at)
        at += tables.first
    found = tables.columns.take(at, axis=1)
    past = strain - found[2 * LINES]
    lines = found[LINES : 2 * LINES]
    lines *= past
    lines += found[:LINES]
    return Look(*lines, *found[2 * LINES + 1 :])


def longest_steps(here: Look, dt_s: float, steady: bool = False) -> tuple[Array, Array]:
    """The longest straight steps up and down, in strain, that keep within the rates on the whole way in `dt_s`: (F,) each."""
    if steady:
        return dt_s * here.fill, dt_s * here.exhaust
    return dt_s * here.fill / (1.0 + dt_s * here.fill_falls), dt_s * here.exhaust / (1.0 + dt_s * here.exhaust_falls)


def _most_above(values: Array, low: Array, reach: Array) -> Array:
    """For each cell the greatest value of itself and of all cells above it that begin below `reach`: (A, n - 1) each."""
    most = values.copy()
    for ahead in range(1, values.shape[1]):
        within = low[:, ahead:] < reach[:, :-ahead]
        if not within.any():
            break
        np.maximum(most[:, :-ahead], values[:, ahead:], out=most[:, :-ahead], where=within)
    return most
