"""Layers on top of one another: the sum of a fiber's base and its added layers, exact, with a knot wherever any has one."""

from itertools import pairwise
from math import comb

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.tables import travel_time_s
from composer.quivers import NONE, Quivers
from composer.score.expand_ways import NO_WAY
from composer.score.layers import Knots, Timed
from composer.shapes import NAMES
from composer.tracks import HOLD, MOVE, SAME_INSTANT_S, STEP, SUDDEN, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]


BLOCK = 1 << 17
"""Knots, as a rule, that are summed at once."""

MOST_PIECES = 1 << 26
"""Pieces that the moves of all layers may be cut into by the knots of the others."""


class Crowded(Exception):
    """Too many layers at once; `line` is that of an entry that runs through most of the others."""

    def __init__(self, line: int):
        self.line = line
        super().__init__(f"too many layers at once on line {line}")


def summed(knots: Knots, timed: Timed, owner: Index, fibers: int, duration_s: float, abilities: Abilities) -> Tracks:
    """The tracks of `fibers` fibers; chain c moves fiber owner[c], the first `fibers` chains being the bases in order.

    A block of fibers at a time, so that what is worked out between fits the processor's cache and little memory.
    Raises Crowded where so many layers move at once that their moves fall into more than MOST_PIECES pieces.
    """
    room = MOST_PIECES
    if len(owner) == fibers:
        return _tracks(knots.first, knots, timed, owner, duration_s)
    chains = np.argsort(owner, kind="stable")
    sizes = np.diff(knots.first)[chains]
    block = np.cumsum(np.bincount(owner, weights=np.diff(knots.first), minlength=fibers)).astype(np.int64) // BLOCK
    edges = np.searchsorted(block[owner[chains]], np.arange(int(block[-1]) + 2))
    layered = np.bincount(owner, minlength=fibers) > 1
    done: list[Knots] = []
    counts = np.zeros(fibers, dtype=np.int64)
    for begin, end in pairwise(edges):
        mine = chains[begin:end]
        if not len(mine):
            continue
        size = sizes[begin:end]
        at = np.repeat(knots.first[mine] - np.cumsum(size) + size, size) + np.arange(size.sum())
        part, fiber = _picked(knots, at), np.repeat(owner[mine], size)
        some = layered[fiber]
        if some.any():
            sums, fiber_of_sums, pieces = _sum(_picked(part, some), fiber[some], np.repeat(mine, size)[some], abilities, room)
            part, fiber = _beside(sums, fiber_of_sums, part, fiber, some)
            room -= pieces
        counts += np.bincount(fiber, minlength=fibers)
        done.append(part)
    whole = Knots(_divided(counts), *(np.concatenate([getattr(part, name) for part in done]) for name in _COLUMNS))
    return _tracks(whole.first, whole, timed, owner, duration_s)


def _divided(counts: Index) -> Index:
    return np.concatenate([[0], np.cumsum(counts)])


def _beside(sums: Knots, fiber_of_sums: Index, part: Knots, fiber: Index, some: NDArray[np.bool_]) -> tuple[Knots, Index]:
    """The sums and, in the order of fibers, those without a layer on top, which go through as they are."""
    plain = _picked(part, ~some)
    both = np.concatenate([fiber[~some], fiber_of_sums])
    order = np.argsort(both, kind="stable")
    columns = (np.concatenate([getattr(plain, name), getattr(sums, name)])[order] for name in _COLUMNS)
    return Knots(part.first, *columns), both[order]


_COLUMNS = ("time_s", "curve", "manner", "shape", "line", "phrase_line", "earliest", "quivers")


def _tracks(first: Index, knots: Knots, timed: Timed, owner: Index, duration_s: float) -> Tracks:
    latest = float(knots.time_s.max(initial=0.0))
    columns = (getattr(knots, name) for name in _COLUMNS[:-2])
    return Tracks(first, *columns, duration_s=max(duration_s, latest), quivers=_quivers(first, knots.time_s, timed, owner))


def _quivers(first: Index, time_s: Array, timed: Timed, owner: Index) -> Quivers:
    """The quivers by the knots at their ends: after all jumps at their first instant, before any at their last."""
    if not len(timed.chain):
        return NONE
    fiber = owner[timed.chain]
    order = np.lexsort((timed.until_s, timed.from_s, fiber))
    fiber, from_s, until_s = fiber[order], timed.from_s[order], timed.until_s[order]
    knot, until = np.empty(len(fiber), dtype=np.int64), np.empty(len(fiber), dtype=np.int64)
    edges = np.append(np.flatnonzero(np.diff(fiber, prepend=-1)), len(fiber))
    for begin, end in pairwise(edges):
        low, high = first[fiber[begin]], first[fiber[begin] + 1]
        mine, part = time_s[low:high], slice(begin, end)
        knot[part] = low + np.searchsorted(mine, from_s[part], side="right") - 1
        until[part] = low + np.searchsorted(mine, until_s[part], side="left")
    return Quivers(knot, until, timed.hertz[order], timed.amplitude[order])


def _picked(knots: Knots, which: NDArray) -> Knots:
    """Some knots, without the division into chains."""
    return Knots(np.zeros(1, dtype=np.int64), *(getattr(knots, name)[which] for name in _COLUMNS))


def _sum(knots: Knots, fiber: Index, chain: Index, abilities: Abilities, room: int) -> tuple[Knots, Index, int]:
    """Knots of the sums, the fiber of each, and how many pieces of moves they took, at most `room`.

    All chains of each fiber together, any number of them.

    A layer that holds is a constant; the constants are added as whole numbers, so that what goes up comes down to the same
    value. Only the layers that move between two knots are added as polynomials.
    """
    ends = np.append(np.where(chain[1:] == chain[:-1], knots.time_s[1:], np.inf), np.inf)
    order = np.lexsort((knots.time_s, fiber))
    f, t = fiber[order], knots.time_s[order]
    new = np.ones(len(order), dtype=bool)
    new[1:] = (f[1:] != f[:-1]) | (t[1:] > t[:-1])
    spot = np.empty(len(order), dtype=np.int64)
    spot[order] = np.cumsum(new) - 1
    at, whose = t[new], f[new]
    until = np.append(np.where(whose[1:] == whose[:-1], at[1:], np.inf), np.inf)

    end_value = knots.curve.sum(axis=1)
    jump, holds = knots.manner == STEP, knots.manner == HOLD
    moving = np.flatnonzero(~jump & ~holds)
    stop = np.append(spot[1:], 0)

    base, moved = _constants(knots, spot, stop, end_value, chain, len(at), whose)
    curve = np.zeros((len(at), 6))
    curve[:, 0] = base
    spans = stop[moving] - spot[moving]
    if (pairs := int(spans.sum())) > room:
        raise Crowded(int(knots.line[moving[np.argmax(spans)]]))
    by = _add_moving(curve, knots, moving, spot[moving], spans, (ends - knots.time_s)[moving], at, until)

    change = np.zeros(len(at) + 1, dtype=np.int64)
    np.add.at(change, spot[moving], 1)
    np.subtract.at(change, stop[moving], 1)
    layers = np.cumsum(change[:-1])
    manner = np.where(layers > 0, MOVE, HOLD).astype(np.int8)
    shape = np.full(len(at), -1, dtype=np.int8)
    earliest = at.copy()
    alone = moving[(spans == 1) & (layers[spot[moving]] == 1)]
    manner[spot[alone]], shape[spot[alone]] = knots.manner[alone], knots.shape[alone]
    earliest[spot[alone]] = knots.earliest[alone]
    quivers = np.zeros(len(at) + 1, dtype=np.int64)
    shaking = moving[knots.quivers[moving] > 0]
    np.add.at(quivers, spot[shaking], 1)
    np.subtract.at(quivers, stop[shaking], 1)
    under = (np.cumsum(quivers[:-1]) > 0).astype(np.int8)
    under[np.concatenate([spot[shaking], stop[shaking]])] *= 2
    flat = (manner != HOLD) & (under == 0) & (np.abs(curve[:, 1:]).max(axis=1) <= NO_WAY)
    manner[flat], shape[flat], curve[flat, 1:] = HOLD, -1, 0.0

    # Whose line: of the layer that moves most, else of the knot that is written last.
    line, phrase_line = np.zeros(len(at), dtype=np.int32), np.zeros(len(at), dtype=np.int32)
    written = np.argsort(knots.line, kind="stable")
    line[spot[written]], phrase_line[spot[written]] = knots.line[written], knots.phrase_line[written]
    moves = np.flatnonzero(by >= 0)
    line[moves], phrase_line[moves] = knots.line[by[moves]], knots.phrase_line[by[moves]]

    jumps = np.zeros(len(at), dtype=bool)
    jumps[spot[jump]] = True
    sums = Knots(np.zeros(1, dtype=np.int64), at, curve, manner, shape, line, phrase_line, earliest, under)
    whole = _with_jumps(sums, jumps, moved, knots, spot, jump)
    owner = np.repeat(whose, 1 + whole[0])
    return *_merged(*_timed_suddens(whole[1], owner, abilities)), pairs


def _add_moving(
    curve: Array, knots: Knots, moving: Index, spot: Index, spans: Index, lasts: Array, at: Array, until: Array
) -> Index:
    """Add what moves to the sums' polynomials, each segment in the pieces that it runs through, from piece `spot` on over
    `spans` of them; the segment that moves most in each piece, -1 where none does."""
    largest, by = np.zeros(len(at)), np.full(len(at), -1, dtype=np.int64)
    chunk = np.cumsum(spans) // BLOCK
    for begin, end in pairwise(np.searchsorted(chunk, np.arange(int(chunk[-1]) + 2 if len(chunk) else 1))):
        if begin == end:
            continue
        span = spans[begin:end]
        which = np.repeat(np.arange(begin, end), span)
        piece = np.repeat(spot[begin:end] - np.cumsum(span) + span, span) + np.arange(len(which))
        segment = moving[which]
        start = (at[piece] - knots.time_s[segment]) / lasts[which]
        part = sub_polynomial(knots.curve[segment], start, (until[piece] - at[piece]) / lasts[which])
        low, high = int(piece.min()), int(piece.max()) + 1
        for power in range(6):
            curve[low:high, power] += np.bincount(piece - low, weights=part[:, power], minlength=high - low)
        way = np.abs(part[:, 1:].sum(axis=1))
        order = np.argsort(way, kind="stable")
        order = order[(way[order] > largest[piece[order]]) | (by[piece[order]] < 0)]
        # Of several that are written to one place the last stays: the largest.
        largest[piece[order]], by[piece[order]] = way[order], segment[order]
    return by


def _constants(
    knots: Knots, spot: Index, stop: Index, end_value: Array, chain: Index, count: int, whose: Index
) -> tuple[Array, Array]:
    """The sum of what holds from each knot on, and the sum of all layers just before each knot's jumps.

    Every layer's value counts from the knot where it begins to hold to where it ends; sums are of whole multiples of a
    power of two, which add without rounding.
    """
    holds, jump = knots.manner == HOLD, knots.manner == STEP
    # The sums of one fiber must fit; over all fibers they may run round, as differences do not mind.
    largest = float(np.bincount(whose[spot], weights=np.abs(knots.curve[:, 0])).max()) + 1.0
    unit = 2.0 ** min(52, 60 - int(np.ceil(np.log2(largest))))
    steps = np.zeros(count + 1, dtype=np.int64)
    value = np.rint(knots.curve[:, 0] * unit).astype(np.int64)
    opens = np.ones(count, dtype=bool)
    opens[1:] = whose[1:] != whose[:-1]
    first_spot = np.maximum.accumulate(np.where(opens, np.arange(count), 0))
    ended = np.append(chain[1:] == chain[:-1], False)
    np.add.at(steps, spot[holds], value[holds])
    np.subtract.at(steps, stop[holds & ended], value[holds & ended])
    gathered = np.cumsum(steps[:-1])
    # Each fiber's sums begin anew: what the fibers before it hold for ever is taken off.
    carried = np.concatenate([[0], gathered])[first_spot]
    base = (gathered - carried) / unit
    # Just before the jumps at a knot: what holds or arrives there, worked out from the layers that jump.
    moved = np.zeros(count)
    np.add.at(moved, spot[jump], (end_value - knots.curve[:, 0])[jump])
    return base, moved


def sub_polynomial(curve: Array, start: Array, share: Array) -> Array:
    """The part of polynomials in u, (n, 6) lowest power first, from u = start over `share` of u, in its own u."""
    part = np.zeros_like(curve)
    for j in range(6):
        for i in range(j, 6):
            part[:, j] += comb(i, j) * curve[:, i] * start ** (i - j)
        part[:, j] *= share**j
    return part


def _with_jumps(
    sums: Knots, jumps: NDArray[np.bool_], moved: Array, knots: Knots, spot: Index, jump: NDArray[np.bool_]
) -> tuple[Index, Knots]:
    """The sums with a STEP before each knot at which layers jump and the jumps do not cancel; how many each got."""
    jumps &= np.abs(moved) > NO_WAY
    extra = jumps.astype(np.int64)
    place = np.arange(len(extra)) + np.cumsum(extra)
    total = len(extra) + int(extra.sum())
    where = place[jumps] - 1
    by, by_phrase = sums.line.copy(), sums.phrase_line.copy()
    by[spot[jump]], by_phrase[spot[jump]] = knots.line[jump], knots.phrase_line[jump]

    def spread(values: NDArray, of_jump: NDArray) -> NDArray:
        wide = np.empty((total, *values.shape[1:]), dtype=values.dtype)
        wide[place], wide[where] = values, of_jump
        return wide

    steps = np.zeros((int(extra.sum()), 6))
    steps[:, 0], steps[:, 1] = sums.curve[jumps, 0] - moved[jumps], moved[jumps]
    return extra, Knots(
        sums.first,
        spread(sums.time_s, sums.time_s[jumps]),
        spread(sums.curve, steps),
        spread(sums.manner, np.full(len(steps), STEP, dtype=np.int8)),
        spread(sums.shape, np.full(len(steps), NAMES.index("step"), dtype=np.int8)),
        spread(sums.line, by[jumps]),
        spread(sums.phrase_line, by_phrase[jumps]),
        spread(sums.earliest, sums.time_s[jumps]),
        spread(sums.quivers, np.zeros(len(steps), dtype=np.int8)),
    )


def _timed_suddens(knots: Knots, fiber: Index, abilities: Abilities) -> tuple[Knots, Index]:
    """Sudden moves that a sum has lifted to other strains, where the fiber has another speed: each starts so that it arrives
    in time, out of the hold before it or after one of its own."""
    sudden = np.flatnonzero(knots.manner == SUDDEN)
    if not sudden.size:
        return knots, fiber
    a, b = knots.curve[sudden, 0], knots.curve[sudden].sum(axis=1)
    arrives = knots.time_s[sudden + 1]
    begins = arrives - travel_time_s(abilities, fiber[sudden], a, b)
    before = np.maximum(sudden - 1, 0)
    waits = (sudden > 0) & (knots.manner[before] == HOLD) & (fiber[before] == fiber[sudden])
    earliest = np.where(waits, np.maximum(knots.time_s[before], knots.earliest[sudden]), knots.time_s[sudden])
    begins = np.where(begins <= earliest + SAME_INSTANT_S, earliest, begins)
    late = ~waits & (begins > knots.time_s[sudden])
    time = knots.time_s.copy()
    old = time[sudden[late]]
    time[sudden] = begins
    # A hold of its own, before each that has none to wait in.
    at = sudden[late]
    hold = np.zeros((len(at), 6))
    hold[:, 0] = knots.curve[at, 0]
    return Knots(
        knots.first,
        np.insert(time, at, old),
        np.insert(knots.curve, at, hold, axis=0),
        np.insert(knots.manner, at, HOLD),
        np.insert(knots.shape, at, -1),
        np.insert(knots.line, at, knots.line[at]),
        np.insert(knots.phrase_line, at, knots.phrase_line[at]),
        np.insert(knots.earliest, at, old),
        np.insert(knots.quivers, at, 0),
    ), np.insert(fiber, at, fiber[at])


def _merged(knots: Knots, fiber: Index) -> tuple[Knots, Index]:
    """The knots with holds of no length left out, and holds in a row made one, also beneath the same quivers."""
    last = np.append(fiber[1:] != fiber[:-1], True)
    kept = np.flatnonzero(last | (knots.manner != HOLD) | (np.append(knots.time_s[1:], np.inf) > knots.time_s))
    again = np.zeros(len(kept), dtype=bool)
    rests = knots.manner[kept] == HOLD
    quivers = knots.quivers[kept]
    still = (quivers > 0) & (knots.manner[kept] == MOVE) & np.all(knots.curve[kept, 1:] == 0.0, axis=1)
    again[1:] = (rests[1:] & rests[:-1]) | (still[1:] & still[:-1] & (quivers[1:] == 1))
    again[1:] &= fiber[kept][1:] == fiber[kept][:-1]
    kept = kept[~again]
    return _picked(knots, kept), fiber[kept]
