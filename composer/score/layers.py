"""From ways to knots: what each chain of instances does over time."""

from dataclasses import dataclass
from math import comb

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.score.expand_lines import Lines
from composer.score.expand_starts import Starts
from composer.score.expand_times import Moments
from composer.score.expand_ways import NO_WAY, POWERS, SUDDENLY, Ways, goes_nowhere, in_strain, ways_of
from composer.shapes import NAMES
from composer.tracks import HOLD, MOVE, SAME_INSTANT_S, STEP, SUDDEN

Array = NDArray[np.float64]
Index = NDArray[np.int64]

BEZIER = np.array([[comb(5, j) * comb(j, i) * (-1.0) ** (j - i) if i <= j else 0.0 for j in range(6)] for i in range(6)])
"""(control, power): a Bézier curve of degree 5 in powers of u (Farin, Curves and Surfaces for CAGD)."""


@dataclass(frozen=True, slots=True, eq=False)
class Knots:
    """Knots of C chains, as Tracks has them of fibers: those of chain c are `first[c]:first[c + 1]`; see Tracks.

    earliest: (K,) s: when a sudden segment might have started at the earliest, its line having the time; else its time
    quivers: (K,) 0 without a quiver over the segment, 1 beneath one, 2 where one begins or ends as well
    """

    first: Index
    time_s: Array
    curve: Array
    manner: NDArray[np.int8]
    shape: NDArray[np.int8]
    line: NDArray[np.int32]
    phrase_line: NDArray[np.int32]
    earliest: Array
    quivers: NDArray[np.int8]


@dataclass(frozen=True, slots=True, eq=False)
class Timed:
    """Q quivers of chains by instants, before there are knots to name: from_s to until_s; Hz; strain; `row` of Lines."""

    chain: Index
    row: Index
    from_s: Array
    until_s: Array
    hertz: Array
    amplitude: Array


def knots_of(found: Moments, starts: Starts, lines: Lines, abilities: Abilities, chains: int) -> tuple[Knots, Timed]:
    """The knots of all chains, with one at each end of every quiver, and the quivers."""
    keep = np.flatnonzero(found.opens | (found.before < found.cut[found.instance]))
    instance, row = found.instance[keep], found.row[keep]
    ways = ways_of(found, starts, lines, abilities, keep)

    before, leaves, stops = found.before[keep], ways.leaves, ways.stops
    until = np.minimum(found.until[keep], found.cut[instance])
    chain = found.chain[instance]
    last_of_instance = np.append(instance[1:] != instance[:-1], True)[: len(instance)]
    following = np.where(last_of_instance, found.cut[instance], until)

    moving = ways.goes & ~goes_nowhere(ways)
    moving &= (stops > leaves) | (np.abs(ways.b - ways.a) > NO_WAY)
    # A line quivers from the line before on; a sudden one until it strikes, as it has no speed to spare from then on.
    ends = np.where(moving & (ways.shape == SUDDENLY), leaves, until)
    amplitude = in_strain(lines.by[row], lines.by_unit[row], ways.fiber, abilities) * starts.scale[found.order[instance]]
    quivers = (lines.hertz[row] > 0.0) & (amplitude > 0.0) & (ends > before + SAME_INSTANT_S)
    stays = np.where(moving, leaves, np.where(quivers, until, following))
    waits = stays > before
    after = np.where(moving, stops, stays)
    trembles = moving & quivers & (until > stops) & (ways.shape != SUDDENLY)
    after = np.where(trembles, until, after)
    rests = (moving | quivers) & (following > after)
    line = np.array([entry.span.line for entry in starts.entries], dtype=np.int32)[starts.entry[found.order]][instance]
    parts = _Parts((waits, moving, trembles, rests), (before, leaves, stops, after), (ways.a, ways.a, ways.b, ways.b), quivers)
    knots = _written(chains, chain, parts, ways, line, lines.phrase_line[row])
    timed = (chain, row, before, ends, lines.hertz[row], amplitude)
    return knots, Timed(*(values[quivers] for values in timed))


@dataclass(frozen=True, slots=True, eq=False)
class _Parts:
    """What each of M moves is made of in time: its wait, its way, what of its line is left and quivers, its rest.

    there, begins_s, strain: four of (M,) each: whether there is such a part, when it begins, the strain there
    quivers: (M,) whether the line quivers, and with it all of these but the rest
    """

    there: tuple[NDArray[np.bool_], ...]
    begins_s: tuple[Array, ...]
    strain: tuple[Array, ...]
    quivers: NDArray[np.bool_]


def _written(
    chains: int,
    chain: Index,
    parts: _Parts,
    ways: Ways,
    line: NDArray[np.int32],
    phrase_line: NDArray[np.int32],
) -> Knots:
    """Knots in order: for each chain one at 0, then for each move its parts; holds made one."""
    sizes = sum(part.astype(np.int64) for part in parts.there)
    per_chain = np.bincount(chain, weights=sizes, minlength=chains).astype(np.int64) + 1
    first = np.concatenate([[0], np.cumsum(per_chain)])
    # Before move m come all earlier knots and the openings of the chains up to its own.
    place = np.cumsum(sizes) - sizes + chain + 1
    total = int(first[-1])
    time, manner = np.zeros(total), np.full(total, HOLD, dtype=np.int8)
    shape = np.full(total, -1, dtype=np.int8)
    made, made_of = np.zeros(total, dtype=np.int32), np.zeros(total, dtype=np.int32)
    start = np.zeros(total)
    way_of = np.full(total, -1, dtype=np.int64)
    quivers = np.zeros(total, dtype=bool)
    for number, (part, when, value) in enumerate(zip(parts.there, parts.begins_s, parts.strain, strict=True)):
        at, move = place[part], np.flatnonzero(part)
        time[at], start[at], made[at], made_of[at] = when[move], value[move], line[move], phrase_line[move]
        if number < 3:
            quivers[at] = parts.quivers[move]
        if number == 1:
            way_of[at] = move
        place += part
    at = np.flatnonzero(way_of >= 0)
    manner[at], shape[at] = _manners(ways, way_of[at])
    quivers &= (manner != STEP) & (manner != SUDDEN)
    manner[quivers & (manner == HOLD)] = MOVE

    # A hold of no length is none, and a hold after a hold is one hold.
    last = first[1:] - 1
    some = np.ones(total, dtype=bool)
    some[:-1] = (manner[:-1] != HOLD) | (time[1:] > time[:-1])
    some[last] = True
    kept = _jumps_made_one(np.flatnonzero(some), manner, start, way_of, ways)
    begins = np.zeros(total, dtype=bool)
    begins[first[:-1]] = True
    opening = np.cumsum(begins)[kept]
    again = np.zeros(len(kept), dtype=bool)
    again[1:] = (manner[kept][1:] == HOLD) & (manner[kept][:-1] == HOLD) & (opening[1:] == opening[:-1])
    kept, opening = kept[~again], opening[~again]
    curve = np.zeros((len(kept), 6))
    curve[:, 0] = start[kept]
    moves = np.flatnonzero(way_of[kept] >= 0)
    curve[moves] = _curves(ways, way_of[kept][moves]) + 0.0  # no negative zeros
    jumps = np.flatnonzero(manner[kept] == STEP)
    curve[jumps, 0], curve[jumps, 1] = start[kept[jumps]], ways.b[way_of[kept[jumps]]] - start[kept[jumps]]
    earliest = time[kept]
    earliest[moves] = np.minimum(earliest[moves], ways.earliest[way_of[kept][moves]])
    return Knots(
        first=np.searchsorted(opening, np.arange(1, chains + 2)),
        time_s=time[kept],
        curve=curve,
        manner=manner[kept],
        shape=shape[kept],
        line=made[kept],
        phrase_line=made_of[kept],
        earliest=earliest,
        quivers=2 * quivers[kept].astype(np.int8),
    )


def _jumps_made_one(kept: Index, manner: NDArray[np.int8], start: Array, way_of: Index, ways: Ways) -> Index:
    """Which of the knots `kept` stay when jumps at one instant are one, from where the first starts, or none where that is
    where the last ends. Changes `start`."""
    jumps = manner[kept] == STEP
    again = np.zeros(len(kept), dtype=bool)
    again[1:] = jumps[1:] & jumps[:-1]
    if not again.any():
        return kept
    last = jumps & ~np.append(again[1:], False)
    leads = np.maximum.accumulate(np.where(again, 0, np.arange(len(kept))))
    start[kept[last]] = start[kept[leads[last]]]
    nowhere = np.zeros(len(kept), dtype=bool)
    nowhere[last] = np.abs(ways.b[way_of[kept[last]]] - start[kept[last]]) <= NO_WAY
    return kept[~jumps | (last & ~nowhere)]


def _manners(ways: Ways, move: Index) -> tuple[NDArray[np.int8], NDArray[np.int8]]:
    """How each move goes, and the shape that it has whole, -1 where it is cut."""
    shape = ways.shape[move].copy()
    manner = np.where(shape == SUDDENLY, SUDDEN, MOVE).astype(np.int8)
    jump = ways.stops[move] <= ways.leaves[move]
    manner[jump] = STEP
    # What is left of a sudden move is a sudden move: as fast as the fiber goes, to where it was cut.
    shape[(ways.share[move] < 1.0) & (shape != SUDDENLY)] = -1
    shape[jump] = NAMES.index("step")
    return manner, shape


def _curves(ways: Ways, move: Index) -> Array:
    """The polynomials of moves, cut where they are cut."""
    way = np.where(np.isnan(ways.target[move]), ways.a[move], ways.target[move]) - ways.a[move]
    cut_sudden = ways.shape[move] == SUDDENLY
    way[cut_sudden] = (ways.b - ways.a)[move[cut_sudden]]
    share = np.where(cut_sudden, 1.0, ways.share[move])
    curve = POWERS[ways.shape[move]] * way[:, None]
    curve[:, 0] = ways.a[move]
    spot = np.full(len(ways.a), -1, dtype=np.int64)
    spot[ways.curved] = np.arange(len(ways.curved))
    of = spot[move]
    bent = np.flatnonzero(of >= 0)
    if bent.size:
        a, target = ways.a[move[bent]], ways.target[move[bent]]
        points = np.column_stack([a, ways.control[of[bent]], target])
        curve[bent] = np.where(np.isnan(points), a[:, None], points) @ BEZIER
    jump = ways.stops[move] <= ways.leaves[move]
    curve[jump, 1:] = 0.0  # where from and where to is for who makes several jumps one
    short = share < 1.0
    if short.any():
        curve[short] *= share[short, None] ** np.arange(6)
    return curve
