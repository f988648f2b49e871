"""What quivers ask of fibers on top of a move: least durations with them, and what no duration mends.

Over a period a quiver of amplitude A and w = 2 pi f runs round in strain and rate, a circle in strain / A and rate / w A but
for its fades. With c = sqrt(1 - (rate / w A)²) its strain over A is

    while it rises   from -(1 + c) / 2 to (1 + c) / 2
    while it falls   from -c to (1 + c) / 2

and at some phase it comes to each of these ends: a quiver fades in upwards, and as it fades out it comes back from nearer. A
move is judged as if it met the quiver at its worst phase at every instant and in full, so that what is in order stays so
at any tempo: its rate plus the quiver's within what the fiber can do at the strain of both, and the quiver's alone as
well, which is all that is left of the two in the slowest of performances. Sums of several quivers are taken at their
greatest rate anywhere within their reach.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.alike import alike
from composer.limits.limit import TOLERANCE
from composer.limits.polynomials import derivative, extremes, value
from composer.limits.tables import slowest_rates
from composer.quivers import pairs
from composer.tracks import MOVE, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]

TURNS = 57
"""Points of a quarter of the border: the rate left is at most 1e-4 of the quiver's own above the least."""

FLAT = 9
"""Points of the border at the greatest rate."""

SAMPLES, ZOOM, ZOOMS = 65, 17, 3
"""Samples of a move's time, and of each of the narrower windows round the worst of them."""

ROWS = 16
"""Moves worked out at a time: few enough that what is worked out stays near the processor."""


def _border(alone: bool) -> tuple[Array, Array, Array]:
    """Strains over A at the worst phases of rising and of falling, and the rates over w A there, either way as positive."""
    if not alone:
        box = np.linspace(-1.0, 1.0, 2 * TURNS)
        return box, box, np.ones(2 * TURNS)
    turn = np.linspace(0.0, 0.5 * np.pi, TURNS)
    wide, flat = 0.5 * (1.0 + np.cos(turn)), np.linspace(-0.5, 0.5, FLAT)
    rising = np.concatenate([wide, -wide, flat])
    falling = np.concatenate([wide, -np.cos(turn), 0.5 * (flat + 0.5)])
    return rising, falling, np.concatenate([np.sin(turn), np.sin(turn), np.ones(FLAT)])


BORDERS = {alone: _border(alone) for alone in (True, False)}


@dataclass(frozen=True, slots=True, eq=False)
class Shaken:
    """The moves that quivers lie over, (S,) rising: the sums of their amplitudes, of their greatest rates in 1/s and
    accelerations in 1/s², the fastest of them in Hz, and whether there is but one.
    """

    segment: Index
    reach: Array
    speed: Array
    bend: Array
    hertz: Array
    alone: NDArray[np.bool_]

    def of(self, segments: Index) -> tuple[Index, Index]:
        """Which of some segments quiver: places in `segments`, and in here."""
        place = np.searchsorted(self.segment, segments)
        found = np.flatnonzero(self.segment[np.minimum(place, len(self.segment) - 1)] == segments)
        return found, place[found]


def shaken(tracks: Tracks) -> Shaken | None:
    """The moves under quivers, None where nothing quivers.

    The acceleration of a quiver is at most twice w² A, reached in fading; where it is shorter than half a period its fades
    overlap and three times bounds it.
    """
    quivers = tracks.quivers
    if not len(quivers):
        return None
    segment, which = pairs(quivers)
    moves = tracks.manner[segment] == MOVE
    segment, which = segment[moves], which[moves]
    if not len(segment):
        return None
    angular = 2.0 * np.pi * quivers.hertz
    lasts = tracks.time_s[quivers.until] - tracks.time_s[quivers.knot]
    bend = np.where(lasts * quivers.hertz < 0.5, 3.0, 2.0) * angular**2 * quivers.amplitude
    one, place, count = np.unique(segment, return_inverse=True, return_counts=True)

    def total(values: Array) -> Array:
        return np.bincount(place, weights=values[which], minlength=len(one))

    hertz = np.zeros(len(one))
    np.maximum.at(hertz, place, quivers.hertz[which])
    return Shaken(one, total(quivers.amplitude), total(angular * quivers.amplitude), total(bend), hertz, count == 1)


@dataclass(frozen=True, slots=True, eq=False)
class Asked:
    """What moves with quivers ask of their fibers, (M,) each.

    least_s: seconds that each takes at least, inf where the quiver alone is too fast; u: the share of its time where it asks
    the most; speed: there of the move alone, strain by u, 0 where the quiver alone is too fast; swing, limit: there the rate
    of the quiver and of the fiber, in 1/s
    """

    least_s: Array
    u: Array
    speed: Array
    swing: Array
    limit: Array


def asked(abilities: Abilities, fiber: Index, curve: Array, moves: Shaken, row: Index) -> Asked:
    """What moves, rows of `moves`, ask with their quivers; within 1e-4 of the fiber's rate over a rate table."""
    reach, speed, alone = moves.reach[row], moves.speed[row], moves.alone[row]
    one, kind = alike(abilities.which[fiber].astype(float), curve, reach, speed, alone.astype(float))
    columns = np.empty((len(Asked.__slots__), len(one)))
    still = np.all(curve[one, 1:] == 0.0, axis=1)
    for single in (True, False):
        for rests in (True, False):
            mine = np.flatnonzero((alone[one] == single) & (still == rests))
            for begin in range(0, len(mine), ROWS):
                part = mine[begin : begin + ROWS]
                which = one[part]
                columns[:, part] = _asked(abilities, fiber[which], curve[which], reach[which], speed[which], single, rests)
    return Asked(*columns[:, kind])


def _asked(
    abilities: Abilities, fiber: Index, curve: Array, reach: Array, speed: Array, alone: bool, rests: bool
) -> tuple[Array, ...]:
    """As `asked`, of moves that are alike in having one quiver and in resting beneath it."""
    speed_curve = derivative(curve)

    def left_at(u: Array) -> _Left:
        return _left(abilities, fiber, value(curve, u), reach, speed, alone)

    def by_quiver(u: Array, left: _Left) -> Array:
        return left.share

    def by_both(u: Array, left: _Left) -> Array:
        way = value(speed_curve, u)
        return np.abs(way) / np.maximum(np.where(way > 0.0, left.fill, left.exhaust), NOTHING_LEFT)

    start = np.zeros((len(fiber), 1)) if rests else np.broadcast_to(np.linspace(0.0, 1.0, SAMPLES), (len(fiber), SAMPLES))
    first = left_at(start)
    share, u_alone = _highest(by_quiver, left_at, start, first)
    least, u_both = _highest(by_both, left_at, start, first)
    too_fast = share > 1.0 + TOLERANCE
    u = np.where(too_fast, u_alone, u_both)
    way = np.where(too_fast, 0.0, value(speed_curve, u))
    left = _left(abilities, fiber, value(curve, u)[:, None], reach, speed, alone)
    swing, limit = (np.where(too_fast, *(told[:, 0] for told in pair)) for pair in left.told(way[:, None] > 0.0))
    return np.where(too_fast, np.inf, least), u, way, swing, limit


NOTHING_LEFT = 1e-12
"""Rate in 1/s that stands for none left beside a quiver that a fiber can only just do."""


@dataclass(frozen=True, slots=True, eq=False)
class _Left:
    """What is left to a move beside its quiver at some strains, (M, n) each.

    fill, exhaust: the least rate left on the border, in 1/s, and the quiver's rate there
    share: the greatest share of the fiber's rate that the quiver takes, and its rate there
    """

    fill: Array
    fill_swing: Array
    exhaust: Array
    exhaust_swing: Array
    share: Array
    share_swing: Array

    def told(self, filling: NDArray[np.bool_]) -> tuple[tuple[Array, Array], tuple[Array, Array]]:
        """Rates of the quiver and of the fiber, where the quiver alone asks the most and where it does beside a move."""
        swing = np.where(filling, self.fill_swing, self.exhaust_swing)
        limit = np.where(filling, self.fill, self.exhaust) + swing
        return (self.share_swing, swing), (self.share_swing / self.share, limit)


def _left(abilities: Abilities, fiber: Index, strain: Array, reach: Array, speed: Array, alone: bool) -> _Left:
    *both, swings = BORDERS[alone]
    swing = np.broadcast_to(speed[:, None, None] * swings, (*strain.shape, len(swings)))
    found: list[Array] = []
    shares = []
    for rate, strains in zip((abilities.fill, abilities.exhaust), both, strict=True):
        limit = _rates(abilities, fiber, rate, strain[:, :, None] + reach[:, None, None] * strains)
        left = limit - swing
        worst = left.argmin(axis=2)[:, :, None]
        found += [np.take_along_axis(values, worst, 2)[:, :, 0] for values in (left, swing)]
        shares.append(swing / limit)
    share = np.maximum(*shares)
    worst = share.argmax(axis=2)[:, :, None]
    found += [np.take_along_axis(values, worst, 2)[:, :, 0] for values in (share, swing)]
    return _Left(*found)


def _rates(abilities: Abilities, fiber: Index, rate: Array, strain: Array) -> Array:
    """The fastest rates in 1/s by the tables `rate`, (A, points), of M fibers at many strains each, (M, ...).

    As `tables.rates`, which finds its place in the tables anew for every strain.
    """
    found = np.empty(strain.shape)
    capability = abilities.which[fiber]
    for each in np.unique(capability).tolist():
        mine = capability == each
        found[mine] = np.interp(strain[mine], abilities.strain[each], rate[each])
    return found


def _highest(
    of: Callable[[Array, _Left], Array], left_at: Callable[[Array], _Left], u: Array, left: _Left
) -> tuple[Array, Array]:
    """The greatest value of each row, (M,), and where: sampled at `u`, (M, n), where so much is left, then in ever narrower
    windows."""
    best, where = np.full(len(u), -np.inf), np.zeros(len(u))
    step = 1.0 / max(u.shape[1] - 1, 1)
    for zoom in range(ZOOMS + 1):
        height = of(u, left if zoom == 0 else left_at(u))
        top = height.argmax(axis=1)
        high = np.take_along_axis(height, top[:, None], 1)[:, 0]
        better = high > best
        best[better], where[better] = high[better], np.take_along_axis(u, top[:, None], 1)[better, 0]
        if u.shape[1] == 1:
            break
        u = np.clip(where[:, None] + step * np.linspace(-1.0, 1.0, ZOOM), 0.0, 1.0)
        step *= 2.0 / (ZOOM - 1)
    return best, where


def excess(abilities: Abilities, fiber: Index, curve: Array, moves: Shaken, row: Index, lasts: Array, u: Array) -> Array:
    """By how much, in 1/s, moves, rows of `moves`, that last so long outrun their fibers with their quivers, at one `u`
    each: (n,), above 0 where they do."""
    reach, speed, alone = moves.reach[row], moves.speed[row], moves.alone[row]
    over = np.empty(len(u))
    for single in (True, False):
        for begin in range(0, len(u), ROWS * SAMPLES):
            mine = np.arange(begin, min(begin + ROWS * SAMPLES, len(u)))
            mine = mine[alone[mine] == single]
            strain = value(curve[mine], u[mine])[:, None]
            left = _left(abilities, fiber[mine], strain, reach[mine], speed[mine], single)
            way = value(derivative(curve[mine]), u[mine]) / lasts[mine]
            beside = np.abs(way) - np.where(way > 0.0, left.fill[:, 0], left.exhaust[:, 0])
            over[mine] = np.maximum(beside, -np.minimum(left.fill, left.exhaust)[:, 0])
    return over


def least_with_quivers(
    tracks: Tracks, abilities: Abilities, segments: Index, fiber: Index, exact: bool = True
) -> tuple[Index, Array, Array]:
    """Of some segments those that quiver, as places in `segments`; their least seconds by rate, and by acceleration.

    exact: False for a ceiling of what the rate asks, at a fraction of its cost
    """
    moves = shaken(tracks)
    if moves is None:
        return np.empty(0, dtype=np.int64), np.empty(0), np.empty(0)
    place, row = moves.of(segments)
    curve, fibers = tracks.curve[segments[place]], fiber[place]
    rate = asked(abilities, fibers, curve, moves, row).least_s if exact else _ceiling(abilities, fibers, curve, moves, row)
    return place, rate, bent_time_s(abilities, fibers, curve, moves.bend[row])


def _ceiling(abilities: Abilities, fiber: Index, curve: Array, moves: Shaken, row: Index) -> Array:
    """Seconds in which moves, rows of `moves`, can be made whatever their quivers: by the least rate anywhere within reach,
    less the greatest of the quiver; inf where that leaves nothing, which says nothing."""
    low, high = extremes(curve)
    slowest, fastest = extremes(derivative(curve))
    reach = moves.reach[row]
    fill, exhaust = (rate - moves.speed[row] for rate in slowest_rates(abilities, fiber, low - reach, high + reach))
    with np.errstate(divide="ignore", invalid="ignore"):
        least = np.maximum(np.maximum(fastest, 0.0) / fill, np.maximum(-slowest, 0.0) / exhaust)
    return np.where((fill > 0.0) & (exhaust > 0.0), least, np.inf)


def bent_time_s(abilities: Abilities, fiber: Index, curve: Array, bend: Array) -> Array:
    """Least seconds by acceleration of moves with so much of it, in 1/s², taken by their quivers; inf where that is all."""
    low, high = extremes(derivative(derivative(curve)))
    left = abilities.accel[fiber] * (1.0 + TOLERANCE) - bend
    own = np.maximum(np.maximum(-low, high), 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        time = np.sqrt(own / np.where(np.isfinite(left), left, np.inf))
    return np.where(left <= 0.0, np.inf, np.where(own > 0.0, time, 0.0))
