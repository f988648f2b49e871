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


NO_QUIVERS = Timed(*(np.empty(0, dtype=np.int64) for _ in range(2)), *(np.empty(0) for _ in range(4)))


def knots_of(found: Moments, starts: Starts, lines: Lines, abilities: Abilities, chains: int) -> tuple[Knots, Timed]:
    """The knots of all chains, with one at each end of every quiver, and the quivers."""
    keep = (found.opens | (found.before < found.cut[found.instance])).nonzero()[0]
    instance, row = found.instance[keep], found.row[keep]
    ways = ways_of(found, starts, lines, abilities, keep)

    before, leaves, stops = found.before[keep], ways.leaves, ways.stops
    chain = found.chain[instance]
    cut = found.cut[instance]
    until, following = np.minimum(found.until[keep], cut), cut
    following[:-1] = np.where(instance[1:] != instance[:-1], cut[:-1], until[:-1])

    moving = ways.goes & ~goes_nowhere(ways)
    moving &= (stops > leaves) | (np.abs(ways.b - ways.a) > NO_WAY)
    line = np.array([entry.span.line for entry in starts.entries], dtype=np.int32)[starts.entry[found.order]][instance]
    if not np.count_nonzero(lines.hertz):
        stays = np.where(moving, leaves, following)
        there = (stays > before, moving, moving & (following > stops))
        parts = _Parts(there, (before, leaves, stops), (ways.a, ways.a, ways.b), None)
        return _written(chains, chain, parts, ways, line, lines.phrase_line[row]), NO_QUIVERS
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
    parts = _Parts((waits, moving, trembles, rests), (before, leaves, stops, after), (ways.a, ways.a, ways.b, ways.b), quivers)
    knots = _written(chains, chain, parts, ways, line, lines.phrase_line[row])
    timed = (chain, row, before, ends, lines.hertz[row], amplitude)
    return knots, Timed(*(values[quivers] for values in timed))


@dataclass(frozen=True, slots=True, eq=False)
class _Parts:
    """What each of M moves is made of in time: its wait, its way, what of its line is left and quivers, its rest.

    there, begins_s, strain: (M,) each of these: whether there is such a part, when it begins, the strain there
    quivers: (M,) whether the line quivers, and with it all of these but the rest; None without any, and nothing that is left
    """

    there: tuple[NDArray[np.bool_], ...]
    begins_s: tuple[Array, ...]
    strain: tuple[Array, ...]
    quivers: NDArray[np.bool_] | None


def _written(
    chains: int,
    chain: Index,
    parts: _Parts,
    ways: Ways,
    line: NDArray[np.int32],
    phrase_line: NDArray[np.int32],
) -> Knots:
    """Knots in order: for each chain one at 0, then for each move its parts; holds made one."""
    move, number = np.array(parts.there).T.nonzero()
    of = number * len(chain) + move
    per_chain = np.bincount(chain[move], minlength=chains) + 1
    total = len(of) + chains
    # Before a knot come all earlier ones and the openings of the chains up to its own.
    place = np.arange(1, len(of) + 1) + chain[move]
    opening = np.arange(chains).repeat(per_chain)
    time, start = np.zeros((2, total))
    time[place] = np.concatenate(parts.begins_s)[of]
    start[place] = np.concatenate(parts.strain)[of]
    move_of, way_of = np.full((2, total), -1, dtype=np.int64)
    move_of[place] = move
    at = (number == 1).nonzero()[0]
    at, way = place[at], move[at]
    way_of[at] = way
    manner, shape = np.full(total, HOLD, dtype=np.int8), np.full(total, -1, dtype=np.int8)
    manner[at], shape[at] = _manners(ways, way)
    quivers = None
    if parts.quivers is not None:
        quivers = np.zeros(total, dtype=bool)
        quivers[place] = parts.quivers[move] & (number < 3)
        quivers &= (manner != STEP) & (manner != SUDDEN)
        manner[quivers & (manner == HOLD)] = MOVE

    # A hold of no length is none, and a hold after a hold is one hold.
    holds = manner == HOLD
    some = ~holds
    some[:-1] |= (time[1:] > time[:-1]) | (opening[1:] != opening[:-1])
    some[-1:] = True
    kept = _jumps_made_one(some.nonzero()[0], manner, start, way_of, ways)
    again, opens, rests = np.zeros(len(kept), dtype=bool), opening[kept], holds[kept]
    again[1:] = rests[1:] & rests[:-1] & (opens[1:] == opens[:-1])
    if np.count_nonzero(again):
        kept, opens = kept[~again], opens[~again]
    time, manner, move, way = time[kept], manner[kept], move_of[kept], way_of[kept]
    curve = np.zeros((len(kept), 6))
    curve[:, 0] = start[kept]
    moves = (way >= 0).nonzero()[0]
    way = way[moves]
    curve[moves] = _curves(ways, way)
    jumps = (manner == STEP).nonzero()[0]
    curve[jumps, 0] = begins = start[kept[jumps]]
    curve[jumps, 1] = ways.b[way_of[kept[jumps]]] - begins
    earliest = time.copy()
    earliest[moves] = np.minimum(time[moves], ways.earliest[way])
    # An opening is no move's: it is of no line.
    made, made_of = np.zeros((2, len(kept)), dtype=np.int32)
    own = (move >= 0).nonzero()[0]
    move = move[own]
    made[own], made_of[own] = line[move], phrase_line[move]
    return Knots(
        first=opens.searchsorted(np.arange(chains + 1)),
        time_s=time,
        curve=curve,
        manner=manner,
        shape=shape[kept],
        line=made,
        phrase_line=made_of,
        earliest=earliest,
        quivers=np.zeros(len(kept), dtype=np.int8) if quivers is None else 2 * quivers[kept].astype(np.int8),
    )


def _jumps_made_one(kept: Index, manner: NDArray[np.int8], start: Array, way_of: Index, ways: Ways) -> Index:
    """Which of the knots `kept` stay when jumps at one instant are one, from where the first starts, or none where that is
    where the last ends. Changes `start`."""
    jumps = manner[kept] == STEP
    again = np.zeros(len(kept), dtype=bool)
    again[1:] = jumps[1:] & jumps[:-1]
    if not np.count_nonzero(again):
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
    """The polynomials of moves, cut where they are cut, without negative zeros."""
    start, target, share, shape = ways.a[move], ways.target[move], ways.share[move], ways.shape[move]
    way = np.where(np.isnan(target), start, target) - start
    short = share < 1.0
    if np.count_nonzero(short):
        cut_sudden = short & (shape == SUDDENLY)
        way[cut_sudden] = ways.b[move[cut_sudden]] - start[cut_sudden]
        share[cut_sudden], short = 1.0, short & ~cut_sudden
    curve = POWERS[shape]
    curve *= way[:, None]
    curve[:, 0] = start
    if ways.curved.size:
        spot = np.full(len(ways.a), -1, dtype=np.int64)
        spot[ways.curved] = np.arange(len(ways.curved))
        of = spot[move]
        bent = (of >= 0).nonzero()[0]
        a = start[bent]
        points = np.column_stack([a, ways.control[of[bent]], target[bent]])
        curve[bent] = np.where(np.isnan(points), a[:, None], points) @ BEZIER
    # Where a jump goes from and to is for who makes several jumps one.
    curve[(ways.stops[move] <= ways.leaves[move]).nonzero()[0], 1:] = 0.0
    if np.count_nonzero(short):
        curve[short] *= share[short, None] ** np.arange(6)
    curve += 0.0
    return curve
