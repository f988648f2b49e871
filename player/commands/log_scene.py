"""What a run's log gives to its picture: wanted and sensed, an instant a column."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

from composer.picture.plots.run import COLUMNS, RunScene
from player.engine.told import Told, wanted_at

Array = NDArray[np.float64]

NEAREST_S = 0.3
"""A column shows the sense nearest to it, if that is no further than so many seconds."""


def scene(log: Told, told: dict[str, Any]) -> RunScene:
    """The picture's contents; `told` is the object of the report."""
    first = float(log.in_force_s[0]) if len(log.in_force_s) else 0.0
    lasts = max(float(log.in_force_s[-1]) - first, 1.0) if len(log.in_force_s) else 1.0
    times = first + (np.arange(COLUMNS) + 0.5) * lasts / COLUMNS
    wanted = wanted_at(log, times, np.arange(len(log.fibers))).T
    marks = tuple(fault["time_s"] - first for fault in told["faults"])
    return RunScene(lasts, wanted, _sensed(log, times), _apart(log, times), marks, told, _extends(log), log.fibers)


def _extends(log: Told) -> NDArray[np.bool_]:
    """(F,) which fibers lengthen; a log that does not tell, or tells nonsense, is taken to have none."""
    told = log.head.get("extends")
    sound = isinstance(told, list) and len(told) == len(log.fibers)
    return np.array([sound and told[n] is True for n in range(len(log.fibers))], dtype=bool)


def _apart(log: Told, times: Array) -> Array:
    """The largest distance of sensed from wanted (T,), of each sense at its own instant; between senses that of the nearest."""
    found = np.full(len(times), np.nan)
    half_s = 0.5 * (times[1] - times[0]) if len(times) > 1 else np.inf
    for part in log.sensed:
        error = np.abs(part.share - wanted_at(log, part.at_s, part.fibers))
        error[~np.isfinite(error)] = -1.0
        worst = error.max(axis=1, initial=-1.0)
        at, worst = part.at_s[worst >= 0.0], worst[worst >= 0.0]
        if not len(at):
            continue
        nearest = _nearest(at, times) if len(at) > 1 else np.zeros(len(times), dtype=np.int64)
        there = np.abs(at[nearest] - times) <= max(NEAREST_S, half_s)
        found[there] = np.fmax(found[there], worst[nearest[there]])
        # Of several senses in a column the worst is shown.
        column = np.clip(np.searchsorted(times, at - half_s), 0, len(times) - 1)
        np.fmax.at(found, column, worst)
    return found


def _nearest(at: Array, times: Array) -> NDArray[np.int64]:
    later = np.clip(np.searchsorted(at, times), 1, len(at) - 1)
    return np.where(times - at[later - 1] < at[later] - times, later - 1, later)


def _sensed(log: Told, times: Array) -> Array:
    """Shares of stroke (F, T) of the sense nearest to each time, nan where there is none near."""
    share = np.full((len(log.fibers), len(times)), np.nan)
    for part in log.sensed:
        if len(part.at_s) < 2:
            continue
        order = np.argsort(part.at_s, kind="stable")
        at = part.at_s[order]
        near = _nearest(at, times)
        values = part.share[order][near].T
        values[:, np.abs(at[near] - times) > NEAREST_S] = np.nan
        known = np.isfinite(values)
        share[part.fibers] = np.where(known, values, share[part.fibers])
    return share
