"""The fewest moves from the start of a take to its end: breadth-first over places and targets, all series at once."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from player.takes.moves import Moves
from player.takes.places import LEVELS, STEPS, Places
from player.takes.played import Array, Index

NEVER = np.iinfo(np.int32).max
HALF, NICKEL, PENNY = 0.1, 0.05, 0.01


@dataclass(frozen=True, slots=True, eq=False)
class Path:
    """The knots of one series: places in UNITs of a count, instants, targets (share of stroke), (K + 1,) each, and the shape
    of the move into each knot after the first, (K,), as in `shapes.NAMES`."""

    place: Index
    time_s: Array
    share: Array
    shape: NDArray[np.int8]

    @property
    def moves(self) -> int:
        """How many moves, holds among them."""
        return len(self.shape)


def fewest(places: Places, moves: Moves) -> tuple[list[Path | None], Index]:
    """A path of the fewest moves for each series, None where no moves lead to its end; and where they break off.

    Of paths with equally few moves one at rounder places and with rounder targets is taken. Where moves break off, the
    search goes on at the place after, so that all breaks are found: numbers of places from which no move leads further.
    """
    steps, breaks = _steps(places, moves)
    broken = np.unique(places.series[breaks])
    by_target = np.argsort(moves.target, kind="stable")
    begins = np.searchsorted(moves.target[by_target], np.arange(len(places.place) + 1))
    levels = places.targets()
    rough = _roughness(places, levels)
    paths = [
        None if series in broken else _back(series, places, moves, steps, by_target, begins, levels, rough)
        for series in range(len(places.first) - 1)
    ]
    return paths, breaks


def _steps(places: Places, moves: Moves) -> tuple[NDArray[np.int32], Index]:
    """How many moves lead to each target of each place at least, (N, LEVELS), and the places where they break off."""
    order = np.argsort(moves.source, kind="stable")
    begins = np.searchsorted(moves.source[order], np.arange(len(places.place) + 1))
    target, masks = moves.target[order], moves.masks[order]
    steps = np.full((len(places.place), LEVELS), NEVER, dtype=np.int32)
    reached = np.zeros(len(places.place), dtype=np.uint8)
    front = places.first[:-1]
    fresh = np.ones(len(front), dtype=np.uint8)
    reached[front], steps[front, 0] = 1, 0
    bits = np.uint8(1) << np.arange(LEVELS, dtype=np.uint8)
    furthest = front.copy()
    breaks: list[Index] = []
    number = 0
    while True:
        if not len(front):
            stuck = furthest[furthest < places.first[1:] - 1]
            if not len(stuck):
                break
            breaks.append(stuck)
            front = stuck + 1
            fresh = np.left_shift(1, places.many[front]).astype(np.uint8) - np.uint8(1)
            fresh &= ~reached[front]
            reached[front] |= fresh
            steps[front[:, None], np.arange(LEVELS)] = np.where(fresh[:, None] & bits, number + 1, steps[front])
            np.maximum.at(furthest, places.series[front], front)
        number += 1
        many = begins[front + 1] - begins[front]
        edge = np.repeat(begins[front] - (np.cumsum(many) - many), many) + np.arange(int(many.sum()))
        from_bits = np.repeat(fresh, many)
        into = np.zeros(len(edge), dtype=np.uint8)
        for level in range(LEVELS):
            into |= np.where(from_bits & bits[level], masks[edge, level], 0).astype(np.uint8)
        there = target[edge]
        into &= ~reached[there]
        some = into != 0
        there, into = there[some], into[some]
        sort = np.argsort(there, kind="stable")
        there, into = there[sort], into[sort]
        lead = np.flatnonzero(np.diff(there, prepend=-1))
        front = there[lead]
        np.maximum.at(furthest, places.series[front], front)
        fresh = np.bitwise_or.reduceat(into, lead)
        reached[front] |= fresh
        rows, level = np.nonzero(fresh[:, None] & bits)
        steps[front[rows], level] = number
    return steps, np.concatenate([*breaks, np.empty(0, np.int64)])


def _roughness(places: Places, levels: Array) -> Array:
    """How ill a knot reads at each target of each place, (N, LEVELS): by its place and by its number."""
    fits = places.place[:, None] % STEPS == 0
    by_place = np.where(fits.any(axis=1), np.argmax(fits, axis=1), len(STEPS))
    by_number = np.full(levels.shape, 4.0)
    for cost, grain in ((3.0, PENNY), (2.0, NICKEL), (1.0, HALF)):
        by_number[np.abs(levels / grain - np.rint(levels / grain)) < 1e-6] = cost
    by_number[np.abs(levels) < 1e-9] = 0.0
    return by_place[:, None] + by_number


def _back(
    series: int,
    places: Places,
    moves: Moves,
    steps: NDArray[np.int32],
    order: Index,
    begins: Index,
    levels: Array,
    rough: Array,
) -> Path:
    """One path, from the end of a series to its start."""
    at = int(places.first[series + 1]) - 1
    best = np.where(steps[at] == steps[at].min(), rough[at], np.inf)
    level = int(np.argmin(best))
    knots, shapes = [(at, level)], []
    while steps[at, level]:
        into = order[begins[at] : begins[at + 1]]
        source = moves.source[into]
        good = (steps[source] == steps[at, level] - 1) & ((moves.masks[into] >> level) & 1).astype(bool)
        edge, from_level = np.nonzero(good)
        cost = rough[source[edge], from_level] + 0.5 * (moves.shape[into[edge]] > 1)
        cost -= 1.0 * (np.abs(levels[source[edge], from_level] - levels[at, level]) < 1e-9)
        pick = int(np.argmin(cost))
        shapes.append(moves.shape[into[edge[pick]]])
        at, level = int(source[edge[pick]]), int(from_level[pick])
        knots.append((at, level))
    knots.reverse()
    node = np.array([place for place, _ in knots])
    share = levels[node, [level for _, level in knots]]
    return Path(places.place[node], places.time_s[node], share, np.array(shapes[::-1], dtype=np.int8))
