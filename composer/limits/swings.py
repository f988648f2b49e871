"""Where moves that quiver really go: their strain as it is, followed from sample to sample and closed in on between.

Samples lie so close that a swing has 32 of them, so that each turn is seen; where one comes near a level its top is closed in
on too, so that a swing that only just touches is not missed between two samples.
"""

from collections.abc import Callable, Iterator
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from composer.limits.polynomials import derivative, value
from composer.limits.quivering import Shaken
from composer.quivers import Over, over, rate_added, strain_added
from composer.tracks import Tracks, durations

Array = NDArray[np.float64]
Index = NDArray[np.int64]

A_SWING, AT_LEAST = 32, 64
"""Samples of a period of the fastest quiver, and of a move."""

BLOCK = 1 << 19
"""Samples worked out at a time, as a rule."""

BISECTIONS = 44

TOPS = 48
"""Steps in which a top is closed in on, each a third of what is left."""


@lru_cache(maxsize=2)
def _over(tracks: Tracks) -> Over | None:
    """Kept for the tracks last asked about: their limits ask one after another."""
    return over(tracks.quivers, tracks.time_s) if len(tracks.quivers) else None


def strain_of(tracks: Tracks, segment: Index, u: Array) -> Array:
    """The strain of segments, (n,), at shares of their time, (n,), quivers and all; of a sudden one its curve's."""
    strain = value(tracks.curve[segment], u)
    if len(tracks.quivers):
        quivers = _over(tracks)
        strain += strain_added(quivers, segment, _times(tracks, segment, u))
    return strain


def climb_of(tracks: Tracks, segment: Index, u: Array) -> Array:
    """The derivative of strain by the share of time, as `strain_of`."""
    climb = value(derivative(tracks.curve[segment]), u)
    if len(tracks.quivers):
        lasts = durations(tracks)[segment]
        climb += rate_added(_over(tracks), segment, _times(tracks, segment, u)) * lasts
    return climb


def _times(tracks: Tracks, segment: Index, u: Array) -> Array:
    begins = tracks.time_s[segment]
    after = tracks.time_s[np.minimum(segment + 1, len(tracks.time_s) - 1)]
    return begins + u * (after - begins)


def stretches(tracks: Tracks, moves: Shaken, row: Index, above: Callable[[Index, Array], Array]) -> tuple[Index, Array, Array]:
    """Where something of moves, rows of `moves`, is above 0: places in `row`, and from and to as shares of their time.

    above: of places in `row`, (n,), and shares, (n,), values (n,)
    """
    found: list[tuple[Index, Array, Array]] = []
    for place, u, first in _samples(tracks, moves, row):
        place, u, first, height = _with_tops(above, place, u, first)
        over_0 = height > 0.0
        last = np.append(first[1:], True)
        change = np.flatnonzero((over_0[1:] != over_0[:-1]) & ~first[1:])
        low, high, rises = u[change], u[change + 1], over_0[change + 1]
        of = place[change]
        for _ in range(BISECTIONS):
            middle = 0.5 * (low + high)
            beyond = (above(of, middle) > 0.0) == rises
            low, high = np.where(beyond, low, middle), np.where(beyond, middle, high)
        edge = 0.5 * (low + high)
        start = np.concatenate([place[first & over_0], of[rises]]), np.concatenate([u[first & over_0], edge[rises]])
        end = np.concatenate([of[~rises], place[last & over_0]]), np.concatenate([edge[~rises], u[last & over_0]])
        by_start, by_end = np.lexsort((start[1], start[0])), np.lexsort((end[1], end[0]))
        found.append((start[0][by_start], start[1][by_start], end[1][by_end]))
    if not found:
        return np.empty(0, dtype=np.int64), np.empty(0), np.empty(0)
    return tuple(np.concatenate(column) for column in zip(*found, strict=True))


def _with_tops(
    above: Callable[[Index, Array], Array], place: Index, u: Array, first: NDArray[np.bool_]
) -> tuple[Index, Array, NDArray[np.bool_], Array]:
    """Samples and their heights, and among them the tops and the bottoms that lie past 0 between two samples on this side."""
    height = above(place, u)
    last = np.append(first[1:], True)
    extra: list[tuple[Index, Array]] = []
    for sign in (1.0, -1.0):
        tall = sign * height
        highest, fall = _falls(tall, first, last)
        at = np.flatnonzero(highest & (tall <= 0.0) & (tall + fall > 0.0))
        if not len(at):
            continue
        of, low, high = place[at], u[at - ~first[at]], u[at + ~last[at]]
        for _ in range(TOPS):
            one, two = low + (high - low) / 3.0, high - (high - low) / 3.0
            rising = sign * above(of, one) < sign * above(of, two)
            low, high = np.where(rising, one, low), np.where(rising, high, two)
        top = 0.5 * (low + high)
        past = sign * above(of, top) > 0.0
        extra.append((of[past], top[past]))
    if not any(len(of) for of, _ in extra):
        return place, u, first, height
    place, u = (np.concatenate([own, *more]) for own, more in zip((place, u), zip(*extra, strict=True), strict=True))
    order = np.lexsort((u, place))
    place, u = place[order], u[order]
    return place, u, np.append(True, place[1:] != place[:-1]), above(place, u)


def _falls(tall: Array, first: NDArray[np.bool_], last: NDArray[np.bool_]) -> tuple[NDArray[np.bool_], Array]:
    """Which samples are no lower than those beside them, and by how much more than they are a top beside them may be.

    Above its highest sample a top rises by less than it falls to the lower sample beside that, or beyond that at an end.
    """
    before = np.where(first, tall, np.roll(tall, 1))
    after = np.where(last, tall, np.roll(tall, -1))
    beyond = np.where(first, np.roll(tall, -2), np.where(last, np.roll(tall, 2), before))
    return (tall >= before) & (tall >= after), tall - np.minimum(np.minimum(before, after), beyond)


def strain_range_of(tracks: Tracks, moves: Shaken, row: Index) -> tuple[Array, Array]:
    """The least and the greatest strain of moves, rows of `moves`: two of (n,)."""
    low, high = np.full(len(row), np.inf), np.full(len(row), -np.inf)
    for place, u, first in _samples(tracks, moves, row):
        begin, last = np.flatnonzero(first), np.append(first[1:], True)
        for sign, best in ((-1.0, low), (1.0, high)):
            strain = sign * strain_of(tracks, moves.segment[row[place]], u)
            top = np.maximum.reduceat(strain, begin)
            best[place[begin]] = sign * top
            # Which swing goes furthest may be another than that of the furthest sample: all are closed in on that might.
            tall, fall = _falls(strain, first, last)
            at = np.flatnonzero(tall & (strain + fall >= np.repeat(top, np.diff(np.append(begin, len(u))))))
            left, right = u[at - ~first[at]], u[at + ~last[at]]
            segment = moves.segment[row[place[at]]]
            for _ in range(BISECTIONS):
                middle = 0.5 * (left + right)
                climbs = sign * climb_of(tracks, segment, middle) > 0.0
                left, right = np.where(climbs, middle, left), np.where(climbs, right, middle)
            further = np.maximum if sign > 0.0 else np.minimum
            further.at(best, place[at], strain_of(tracks, segment, 0.5 * (left + right)))
    return low, high


def _samples(tracks: Tracks, moves: Shaken, row: Index) -> Iterator[tuple[Index, Array, NDArray[np.bool_]]]:
    """Samples of moves, rows of `moves`, a block of whole moves at a time: place in `row`, share, whether a move's first."""
    lasts = durations(tracks)[moves.segment[row]]
    counts = np.maximum(np.ceil(lasts * moves.hertz[row] * A_SWING), AT_LEAST).astype(np.int64) + 1
    block = (np.cumsum(counts) - counts) // BLOCK
    for number in np.unique(block):
        mine = np.flatnonzero(block == number)
        count = counts[mine]
        place = np.repeat(mine, count)
        index = np.arange(len(place)) - np.repeat(np.cumsum(count) - count, count)
        yield place, index / (counts[place] - 1), index == 0
