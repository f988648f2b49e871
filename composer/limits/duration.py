"""The least time that a move can take: D_min, from its curve and the rates of its fiber.

Scaling a curve's time by D divides its speed by D and its acceleration by D², so the least D that meets a bound on speed at
every strain and a bound on acceleration is known without any search over D (Bobrow, Dubowsky and Gibson 1985).
"""

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.alike import alike
from composer.limits.over_tables import durations_over_tables
from composer.limits.polynomials import derivative, extremes
from composer.limits.quivering import least_with_quivers
from composer.limits.tables import slowest_rates, tables_of, travel_time_s
from composer.shapes import NAMES, PROGRESS
from composer.tracks import MOVE, STEP, SUDDEN, Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

RESOLUTION = 1.0 / 65535.0
"""The least step of a drive's set-point, as a share of usable stroke: sixteen bits on the wire."""

BLOCK = 1 << 16
"""Segments worked out at a time: arrays that stay in the processor's caches keep the cost of a move the same at any size."""

STEP_S = 0.005
"""A jump is told to its reader as if made within one tick of this many seconds."""


def _peaks(order: int) -> Array:
    """The greatest derivative of each named shape's progress, nan for those whose curve is their own: (shapes,)."""
    peaks = np.full(len(NAMES), np.nan)
    for name, progress in PROGRESS.items():
        curve = progress[None]
        for _ in range(order):
            curve = derivative(curve)
        peaks[NAMES.index(name)] = np.abs(extremes(curve)).max()
    return peaks


PEAK_SPEED, PEAK_ACCELERATION = _peaks(1), _peaks(2)
"""By shape, over a move's mean: 15/8 and 10/sqrt(3) for minimum jerk (Flash and Hogan 1985), 2 and 2 for swell and settle."""


def least_durations(tracks: Tracks, abilities: Abilities, segments: Index | None = None) -> Array:
    """Seconds that each segment takes at least, (K,) or one for each of `segments`.

    0 for holds, and for jumps below the drive's resolution; inf for any other jump and for what quivers faster than its fiber.
    Exact where rates are the same at every strain, within 1e-4 of itself over a rate table; a move that quivers is judged at
    the worst phase of its quiver (`quivering`).
    """
    return _durations(tracks, abilities, segments, exact=True)


def duration_ceilings(tracks: Tracks, abilities: Abilities, segments: Index | None = None) -> Array:
    """As `least_durations`, but never below it and at a fraction of its cost: every move by the least rate on its way.

    The two are equal where rates are the same at every strain. A segment that lasts as long as its ceiling is in order.
    """
    return _durations(tracks, abilities, segments, exact=False)


def _durations(tracks: Tracks, abilities: Abilities, segments: Index | None, exact: bool) -> Array:
    where = np.arange(len(tracks.time_s)) if segments is None else np.asarray(segments, dtype=np.int64)
    fibers = fiber_of(tracks)[where]
    blocks = range(0, len(where), BLOCK) or range(1)
    least = np.concatenate([_of_block(tracks, abilities, where[b : b + BLOCK], fibers[b : b + BLOCK], exact) for b in blocks])
    place, by_rate, by_acceleration = least_with_quivers(tracks, abilities, where, fibers, exact)
    least[place] = np.maximum(by_rate, by_acceleration)
    return least


def _of_block(tracks: Tracks, abilities: Abilities, where: Index, fibers: Index, exact: bool) -> Array:
    manner = tracks.manner[where]
    least = np.zeros(len(where))
    moving = np.flatnonzero(manner == MOVE)
    if len(moving):
        fiber, curve, shape = fibers[moving], tracks.curve[where[moving]], tracks.shape[where[moving]]
        least[moving] = np.maximum(
            durations_by_rate(abilities, fiber, curve, shape, exact), acceleration_time_s(abilities, fiber, curve, shape)
        )
    sudden = np.flatnonzero(manner == SUDDEN)
    if len(sudden):
        curve = tracks.curve[where[sudden]]
        least[sudden] = travel_time_s(abilities, fibers[sudden], curve[:, 0], curve.sum(axis=1))
    jumps = np.flatnonzero(manner == STEP)
    if len(jumps):
        size = np.abs(tracks.curve[where[jumps], 1:].sum(axis=1))
        least[jumps] = np.where(size > abilities.stroke[fibers[jumps]] * RESOLUTION, np.inf, 0.0)
    return least


def speed_range(curve: Array, shape: NDArray[np.int8]) -> tuple[Array, Array]:
    """Least and greatest derivative of strain by u over each move, (K,) each, 0 where it never goes that way."""
    distance = curve[:, 1:].sum(axis=1)
    named = _named(PEAK_SPEED, shape) * distance
    low, high = np.minimum(named, 0.0), np.maximum(named, 0.0)
    own = np.flatnonzero(np.isnan(named))
    if len(own):
        least, greatest = extremes(derivative(curve[own]))
        low[own], high[own] = np.minimum(least, 0.0), np.maximum(greatest, 0.0)
    return low, high


def acceleration_time_s(abilities: Abilities, fiber: Index, curve: Array, shape: NDArray[np.int8]) -> Array:
    """Least seconds for each move by its fiber's acceleration limit alone, sqrt(max |s''(u)| / A): (K,)."""
    time = np.zeros(len(fiber))
    bound = np.flatnonzero(np.isfinite(abilities.accel[fiber]))
    if len(bound):
        time[bound] = np.sqrt(greatest_bend(curve[bound], shape[bound]) / abilities.accel[fiber[bound]])
    return time


def greatest_bend(curve: Array, shape: NDArray[np.int8]) -> Array:
    """The greatest |s''(u)| of each move, (K,)."""
    bend = _named(PEAK_ACCELERATION, shape) * np.abs(curve[:, 1:].sum(axis=1))
    own = np.flatnonzero(np.isnan(bend))
    if len(own):
        low, high = extremes(derivative(derivative(curve[own])))
        bend[own] = np.maximum(-low, high)
    return bend


def _named(peaks: Array, shape: NDArray[np.int8]) -> Array:
    return np.where(shape >= 0, peaks[np.maximum(shape, 0)], np.nan)


def durations_by_rate(abilities: Abilities, fiber: Index, curve: Array, shape: NDArray[np.int8], exact: bool = True) -> Array:
    """Least seconds by the rates alone, (K,): closed forms where they are constant, else exact or a ceiling."""
    low, high = speed_range(curve, shape)
    tables, capability = tables_of(abilities), abilities.which[fiber]
    first = capability * tables.points
    least = np.maximum(high / tables.fill.rate[first], -low / tables.exhaust.rate[first])
    varying = np.flatnonzero(~abilities.constant[capability])
    if not len(varying):
        return least
    if exact:
        one, kind = alike(capability[varying].astype(float), curve[varying])
        least[varying] = durations_over_tables(abilities, fiber[varying][one], curve[varying][one])[kind]
    else:
        bottom, top = strain_range(curve[varying], shape[varying])
        fill, exhaust = slowest_rates(abilities, fiber[varying], bottom, top)
        least[varying] = np.maximum(high[varying] / fill, -low[varying] / exhaust)
    return least


def strain_range(curve: Array, shape: NDArray[np.int8]) -> tuple[Array, Array]:
    """Least and greatest strain of each segment, (K,) each; a named shape never leaves the way between its ends."""
    start, end = curve[:, 0], curve.sum(axis=1)
    low, high = np.minimum(start, end), np.maximum(start, end)
    own = np.flatnonzero(np.isnan(_named(PEAK_SPEED, shape)))
    own = own[np.any(curve[own, 1:] != 0.0, axis=1)]
    if len(own):
        low[own], high[own] = extremes(curve[own])
    return low, high


def one_way(tracks: Tracks) -> NDArray[np.bool_]:
    """(K,) the segments whose curve never turns back: of a named shape, or no move. A sum, a cut or an own curve may."""
    return (tracks.manner != MOVE) | ((tracks.shape >= 0) & ~np.isnan(_named(PEAK_SPEED, tracks.shape)))
