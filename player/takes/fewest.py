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
    broken = np.isin(np.arange(len(places.first) - 1), places.series[breaks])
    levels = places.targets_of(np.arange(len(places.place))).T
    after, by = _roundest(places, moves, steps, _roughness(places, levels), levels, ~broken)
    return [
        None if broken[series] else _onward(int(begin) * LEVELS, places, moves, levels, after, by)
        for series, begin in enumerate(places.first[:-1])
    ], breaks


_LANES = 8 * np.arange(LEVELS, dtype=np.uint64)
_SPREAD = np.bitwise_or.reduce(
    np.where(np.arange(1 << LEVELS)[:, None] >> np.arange(LEVELS) & 1 > 0, np.uint64(255) << _LANES, np.uint64(0)), axis=1
)
"""For some targets, as bits, all bits of the bytes that stand for them, one byte a target."""

_HALVES = tuple(np.uint64(bits) for bits in (32, 16, 8))


def _steps(places: Places, moves: Moves) -> tuple[NDArray[np.int32], Index]:
    """How many moves lead to each target of each place at least, (N, LEVELS), and the places where they break off."""
    order = np.argsort(moves.source, kind="stable")
    begins = np.searchsorted(moves.source[order], np.arange(len(places.place) + 1))
    target = moves.target[order]
    # The masks of a move in one number, a byte for each target that it sets out from.
    masks = np.bitwise_or.reduce(moves.masks[order].astype(np.uint64) << _LANES, axis=1)
    steps = np.full((len(places.place), LEVELS), NEVER, dtype=np.int32)
    reached = np.zeros(len(places.place), dtype=np.uint8)
    front = places.first[:-1]
    fresh = np.ones(len(front), dtype=np.uint8)
    reached[front], steps[front, 0] = 1, 0
    bits = np.uint8(1) << np.arange(LEVELS, dtype=np.uint8)
    furthest, last = front.copy(), places.first[1:] - 1
    breaks: list[Index] = []
    number = 0
    while True:
        if not len(front):
            stuck = furthest[furthest < last]
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
        edge, many = _runs(begins, front)
        into = masks[edge] & _SPREAD[fresh].repeat(many)
        for half in _HALVES:
            into |= into >> half
        into = into.astype(np.uint8)
        there = target[edge]
        into &= ~reached[there]
        some = into.nonzero()[0]
        there, into = there[some], into[some]
        sort = there.argsort(kind="stable")
        there = there[sort]
        lead = _leads(there)
        front = there[lead]
        np.maximum.at(furthest, places.series[front], front)
        fresh = np.bitwise_or.reduceat(into[sort], lead) if len(lead) else into
        reached[front] |= fresh
        rows, level = (fresh[:, None] & bits).nonzero()
        steps[front[rows], level] = number
    return steps, np.concatenate([*breaks, np.empty(0, np.int64)])


def _runs(begins: Index, some: Index) -> tuple[Index, Index]:
    """All numbers from `begins` of each of some to that of the next, run after run, and how many there are in each run."""
    first = begins[some]
    many = begins[some + 1] - first
    end = many.cumsum()
    return (first - end + many).repeat(many) + np.arange(end[-1] if len(end) else 0), many


def _leads(values: Index) -> Index:
    """Where runs of equal values begin."""
    new = np.ones(len(values), dtype=bool)
    np.not_equal(values[1:], values[:-1], out=new[1:])
    return new.nonzero()[0]


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
    places: Places, moves: Moves, steps: NDArray[np.int32], rough: Array, levels: Array, whole: NDArray[np.bool_]
) -> tuple[Index, Index]:
    """Of the ways of fewest moves the one that reads best, from the ends back: for each state (place times LEVELS plus target)
    the state after and the move to there, (N * LEVELS,), below 0 where no way of fewest moves to an end comes by.

    whole: (S,) series in which moves lead to the end
    """
    order = np.argsort(moves.target, kind="stable")
    begins = np.searchsorted(moves.target[order], np.arange(len(places.place) + 1))
    source, masks, bent = moves.source[order], moves.masks[order], BENT * (moves.shape[order] > 1)
    last = places.first[1:][whole] - 1
    ends = steps[last]
    row, level = np.nonzero((ends == ends.min(axis=1, keepdims=True)) & (ends != NEVER))
    waits = last[row] * LEVELS + level
    arrives = steps.ravel()[waits]
    flat, looks = levels.ravel(), rough.ravel()
    cost = np.zeros(steps.size)
    after, by = np.full(steps.size, -1), np.full(steps.size, -1)
    front = np.empty(0, dtype=np.int64)
    for now in range(int(arrives.max(initial=0)), 0, -1):
        # Series of fewer moves join in where their last one is.
        late = waits[arrives == now]
        if len(late):
            front = np.sort(np.concatenate([front, late]))
        there = front // LEVELS
        edge, many = _runs(begins, there)
        leads = steps[source[edge]] == now - 1
        leads &= masks[edge] & (1 << (front - there * LEVELS)).astype(np.uint8).repeat(many)[:, None] > 0
        some, left = leads.nonzero()
        edge, right = edge[some], front.repeat(many)[some]
        left += source[edge] * LEVELS
        total = cost[right] + looks[right]
        total += bent[edge]
        total += HELD * (np.abs(flat[left] - flat[right]) < 1e-9)
        sort = left.argsort(kind="stable")
        total, left = total[sort], left[sort]
        lead = _leads(left)
        least = np.minimum.reduceat(total, lead)
        best = (total <= least.repeat(np.diff(lead, append=len(total)))).nonzero()[0]
        best = best[_leads(left[best])]
        front = left[lead]
        cost[front] = least
        after[front], by[front] = right[sort[best]], order[edge[sort[best]]]
    return after, by


def _onward(state: int, places: Places, moves: Moves, levels: Array, after: Index, by: Index) -> Path:
    """The path that leads on from a state."""
    states, shapes = [state], []
    while after[state] >= 0:
        shapes.append(moves.shape[by[state]])
        state = int(after[state])
        states.append(state)
    node, level = np.divmod(np.array(states), LEVELS)
    return Path(places.place[node], places.time_s[node], levels[node, level], np.array(shapes, dtype=np.int8))
