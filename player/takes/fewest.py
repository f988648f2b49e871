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
    levels = places.targets_of(np.arange(len(places.place))).T
    cost, before, by = _roundest(places, moves, steps, _roughness(places, levels), levels)
    paths: list[Path | None] = []
    for series, last in enumerate(places.first[1:] - 1):
        ends = np.where(steps[last] == steps[last].min(), cost[last], np.inf)
        found = last * LEVELS + int(np.argmin(ends))
        paths.append(None if series in broken else _back(found, places, moves, levels, before, by))
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


BENT = 0.5
"""What a bent shape costs beside a straight or a smooth one, in the same measure as places and targets."""

HELD = -1.0
"""What a hold costs."""


def _roundest(
    places: Places, moves: Moves, steps: NDArray[np.int32], rough: Array, levels: Array
) -> tuple[Array, NDArray[np.int64], NDArray[np.int64]]:
    """Of the ways of fewest moves the one that reads best: for each target of each place its cost, (N, LEVELS), and for each
    state (place times LEVELS plus target) the state before and the move from there, (N * LEVELS,).

    States that lead to no end by a way of fewest moves are left out.
    """
    cost = np.zeros(steps.size)
    before, by = np.full(steps.size, -1), np.full(steps.size, -1)
    flat, looks = levels.ravel(), rough.ravel()
    bent = BENT * (moves.shape > 1)
    for edge, left, right in reversed(_tight(places, moves, steps)):
        each = looks[right] + bent[edge]
        each += HELD * (np.abs(flat[left] - flat[right]) < 1e-9)
        total = cost[left] + each
        order = np.argsort(right, kind="stable")
        total, state = total[order], right[order]
        lead = np.flatnonzero(np.diff(state, prepend=-1))
        least = np.minimum.reduceat(total, lead)
        best = np.flatnonzero(total <= np.repeat(least, np.diff(lead, append=len(total))))
        best = best[np.flatnonzero(np.diff(state[best], prepend=-1))]
        cost[state[best]] = least
        before[state[best]], by[state[best]] = left[order[best]], edge[order[best]]
    return cost.reshape(steps.shape), before, by


def _tight(places: Places, moves: Moves, steps: NDArray[np.int32]) -> list[tuple[Index, Index, Index]]:
    """What ways of fewest moves to the ends are made of: moves, states that they come from, and go to; the last moves first."""
    order = np.argsort(moves.target, kind="stable")
    begins = np.searchsorted(moves.target[order], np.arange(len(places.place) + 1))
    source, masks = moves.source[order], moves.masks[order]
    last = places.first[1:] - 1
    ends = steps[last]
    row, level = np.nonzero((ends == ends.min(axis=1, keepdims=True)) & (ends != NEVER))
    waits = last[row] * LEVELS + level
    number = steps.ravel()[waits]
    found = []
    front = np.empty(0, dtype=np.int64)
    for now in range(int(number.max(initial=0)), 0, -1):
        # Series of fewer moves join in where their last one is.
        front = np.unique(np.concatenate([front, waits[number == now]]))
        there, into = np.divmod(front, LEVELS)
        many = begins[there + 1] - begins[there]
        edge = np.repeat(begins[there] - (np.cumsum(many) - many), many) + np.arange(int(many.sum()))
        into, right = np.repeat(into, many), np.repeat(front, many)
        leads = steps[source[edge]] == now - 1
        leads &= (masks[edge] >> into[:, None].astype(np.uint8)) & 1 > 0
        some, left = np.nonzero(leads)
        edge, right = edge[some], right[some]
        left += source[edge] * LEVELS
        edge = order[edge]
        sort = np.lexsort((left, edge))
        found.append((edge[sort], left[sort], right[sort]))
        front = np.unique(left)
    return found


def _back(state: int, places: Places, moves: Moves, levels: Array, before: Index, by: Index) -> Path:
    """The path that leads to a state."""
    states, shapes = [state], []
    while before[state] >= 0:
        shapes.append(moves.shape[by[state]])
        state = int(before[state])
        states.append(state)
    node, level = np.divmod(np.array(states[::-1]), LEVELS)
    return Path(places.place[node], places.time_s[node], levels[node, level], np.array(shapes[::-1], dtype=np.int8))
