"""From lines to knots: what each chain of instances does over time, cut where a later one takes over."""

from dataclasses import dataclass
from math import comb

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.tables import strain_after, travel_time_s
from composer.score.expand_lines import HELD, Lines
from composer.score.expand_starts import Starts
from composer.score.expand_times import Moments
from composer.score.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, SAME_INSTANT_S, STEP, SUDDEN

Array = NDArray[np.float64]
Index = NDArray[np.int64]

CURVE, SUDDENLY = NAMES.index("curve"), NAMES.index("sudden")

NO_WAY = 1e-12
"""Strain below which a move goes nowhere and is a hold."""

SETTLED = 1e-13
"""Strain to which values must agree that were worked out one from the other; far below NO_WAY, above what rounding does."""

NUDGE = 1e-7
"""Step in strain for a slope by differences."""

POWERS = np.array([PROGRESS.get(name, np.zeros(6)) for name in NAMES])
BEZIER = np.array([[comb(5, j) * comb(j, i) * (-1.0) ** (j - i) if i <= j else 0.0 for j in range(6)] for i in range(6)])
"""(control, power): a Bézier curve of degree 5 in powers of u (Farin, Curves and Surfaces for CAGD)."""


@dataclass(frozen=True, slots=True, eq=False)
class Knots:
    """Knots of C chains, as Tracks has them of fibers: those of chain c are `first[c]:first[c + 1]`; see Tracks.

    earliest: (K,) s: when a sudden segment might have started at the earliest, its line having the time; else its time
    """

    first: Index
    time_s: Array
    curve: Array
    manner: NDArray[np.int8]
    shape: NDArray[np.int8]
    line: NDArray[np.int32]
    phrase_line: NDArray[np.int32]
    earliest: Array


def in_strain(value: Array, unit: NDArray[np.int8], fiber: Index, abilities: Abilities) -> Array:
    """Targets in strain; 0 for `hold`."""
    # In the order of TARGET_UNITS.
    per = np.stack(
        [
            abilities.stroke,
            np.full_like(abilities.stroke, 0.01),
            1.0 / abilities.length_mm,
            1.0 / abilities.turn_deg,
            np.zeros_like(abilities.stroke),
        ]
    )
    return value * per[unit, fiber]


@dataclass(slots=True, eq=False)
class _Ways:
    """M moves of one score in order of chain: from `a` to `b` between `leaves` (at `earliest`) and `arrives`, cut at `stops`.

    goes: no hold and not cut before it begins; sudden: those that follow the rate table
    share: (M,) of its time that a move has until `stops`, 1 where it is whole; target: nan where it holds
    control: rows (indices of moves) and (n, 4) values of those of shape `curve`, nan where a control holds
    """

    fiber: Index
    leads: NDArray[np.bool_]
    earliest: Array
    leaves: Array
    arrives: Array
    stops: Array
    goes: NDArray[np.bool_]
    share: Array
    shape: NDArray[np.int8]
    target: Array
    curved: Index
    control: Array
    a: Array
    b: Array


def knots_of(found: Moments, starts: Starts, lines: Lines, abilities: Abilities, chains: int) -> Knots:
    """The knots of all chains. Every fiber has the units of its targets: `check_names` has seen to it."""
    keep = np.flatnonzero(found.opens | (found.before < found.cut[found.instance]))
    instance, row = found.instance[keep], found.row[keep]
    ways = _ways(found, starts, lines, abilities, keep)
    _solve_values(ways, abilities)
    _start_suddens(ways, abilities)

    before, leaves, stops = found.before[keep], ways.leaves, ways.stops
    until = np.minimum(found.until[keep], found.cut[instance])
    chain = found.chain[instance]
    last_of_instance = np.append(instance[1:] != instance[:-1], True)[: len(instance)]
    following = np.where(last_of_instance, found.cut[instance], until)

    moving = ways.goes & ~_goes_nowhere(ways)
    moving &= (stops > leaves) | (np.abs(ways.b - ways.a) > NO_WAY)
    waits = np.where(moving, leaves, following) > before
    rests = moving & (following > stops)
    line = np.array([entry.span.line for entry in starts.entries], dtype=np.int32)[starts.entry[found.order]][instance]
    return _written(chains, chain, (waits, moving, rests), (before, leaves, stops), ways, line, lines.phrase_line[row])


def _ways(found: Moments, starts: Starts, lines: Lines, abilities: Abilities, keep: Index) -> _Ways:
    instance, row = found.instance[keep], found.row[keep]
    which = found.order[instance]
    fiber, scale, shape = starts.fiber[which], starts.scale[which], lines.shape[row]
    leaves, arrives, cut = found.leaves[keep], found.arrives[keep], found.cut[instance]
    held = lines.unit[row] == HELD
    target = in_strain(lines.value[row], lines.unit[row], fiber, abilities) * scale
    target[held] = np.nan
    curved = np.flatnonzero(shape == CURVE)
    units = lines.control_unit[row[curved]]
    control = in_strain(lines.control[row[curved]], units, fiber[curved, None], abilities) * scale[curved, None]
    control[units == HELD] = np.nan
    stops = np.minimum(arrives, cut)
    goes = (leaves < cut) | ((leaves == arrives) & (leaves <= cut))
    goes &= ~held | (shape == CURVE)
    lasts = arrives - leaves
    share = np.divide(stops - leaves, lasts, out=np.ones_like(lasts), where=(stops < arrives) & goes)
    leads = np.ones(len(keep), dtype=bool)
    chain = found.chain[instance]
    leads[1:] = chain[1:] != chain[:-1]
    empty = np.zeros(len(keep))
    return _Ways(fiber, leads, leaves, leaves.copy(), arrives, stops, goes, share, shape, target, curved, control, empty, empty)


def _solve_values(ways: _Ways, abilities: Abilities) -> None:
    """Where each move starts and ends: b = alpha * a + beta, each starting where the one before ended, 0 at first.

    Only a `sudden` that is cut is no such line; where it is cut is worked out from where it starts, again until nothing
    changes. A round settles at least the first of a row that still changes, so it ends; as a rule after two or three.
    """
    whole = ways.share == 1.0
    gone = _at(POWERS[ways.shape], ways.share)
    gone[whole] = 1.0
    alpha = np.where(ways.goes & ~np.isnan(ways.target), 1.0 - gone, 1.0)
    beta = np.where(alpha == 1.0, 0.0, np.nan_to_num(ways.target) * gone)
    if ways.curved.size:
        at = ways.curved[ways.goes[ways.curved]]
        control = ways.control[ways.goes[ways.curved]]
        weights = np.where(whole[at, None], np.eye(6)[5], _bernstein(ways.share[at]))
        inner = np.column_stack([np.full(len(at), np.nan), control, ways.target[at]])
        held = np.isnan(inner)
        alpha[at] = np.sum(np.where(held, weights, 0.0), axis=1)
        beta[at] = np.sum(np.where(held, 0.0, weights * np.nan_to_num(inner)), axis=1)
    cut = np.flatnonzero((ways.shape == SUDDENLY) & ways.goes & ~whole)
    alpha[ways.leads] = 0.0
    if cut.size:
        # Whether one that is cut has begun is not known yet: the first guess is that it has, and went all the way.
        alpha[cut], beta[cut] = 0.0, ways.target[cut]
    b = affine_scan(alpha, beta)
    for _ in range(len(cut)):
        a = _shifted(b, ways.leads)[cut]
        reached = _cut_sudden(ways, abilities, cut, a)
        if np.all(np.abs(reached - b[cut]) <= SETTLED):
            break
        # Newton's step for the whole row at once; a move that has not begun yet ends where it starts.
        slope = (_cut_sudden(ways, abilities, cut, a + NUDGE) - reached) / NUDGE
        slope = np.where(reached == a, 1.0, np.where(slope < 1e-6, 0.0, np.minimum(slope, 1.0)))
        alpha[cut], beta[cut] = np.where(ways.leads[cut], 0.0, slope), reached - slope * a
        b = affine_scan(alpha, beta)
    ways.b, ways.a = b, _shifted(b, ways.leads)


def _shifted(b: Array, leads: NDArray[np.bool_]) -> Array:
    """Where each move starts: the end of the one before, 0 for the first of a chain."""
    a = np.empty_like(b)
    a[1:] = b[:-1]
    a[leads] = 0.0
    return a


def _cut_sudden(ways: _Ways, abilities: Abilities, cut: Index, a: Array) -> Array:
    """The strain that a sudden move which starts from `a` has where it is cut."""
    fiber, target = ways.fiber[cut], ways.target[cut]
    needs, has = travel_time_s(abilities, fiber, a, target), ways.arrives[cut] - ways.leaves[cut]
    begins = np.maximum(ways.leaves[cut], ways.arrives[cut] - needs)
    # Where there is less time than needed it runs through the same way faster.
    faster = np.where(needs > has, needs / has, 1.0)
    gone = ways.stops[cut] - begins
    return np.where(gone <= SAME_INSTANT_S, a, strain_after(abilities, fiber, a, target, np.maximum(0.0, gone) * faster))


def _start_suddens(ways: _Ways, abilities: Abilities) -> None:
    """A sudden move starts as late as it can: its leave becomes that instant."""
    sudden = np.flatnonzero((ways.shape == SUDDENLY) & ways.goes & (ways.arrives > ways.leaves))
    if not sudden.size:
        return
    needs = travel_time_s(abilities, ways.fiber[sudden], ways.a[sudden], ways.target[sudden])
    begins = ways.arrives[sudden] - needs
    early = ways.leaves[sudden]
    begins = np.where(begins <= early + SAME_INSTANT_S, early, begins)
    ways.leaves[sudden] = np.minimum(begins, ways.stops[sudden])
    ways.goes[sudden] &= (ways.leaves[sudden] < ways.stops[sudden]) & (np.abs(ways.b - ways.a)[sudden] > NO_WAY)


def affine_scan(alpha: Array, beta: Array) -> Array:
    """All v[i] = alpha[i] v[i - 1] + beta[i], alpha[0] being 0: pointer doubling (Hillis and Steele 1986).

    Only what still hangs on an earlier value is worked on, so its cost is that of the longest run of holds and cuts.
    """
    value = beta.copy()
    at = np.flatnonzero(alpha)
    factor, behind = alpha[at], at - 1
    place = np.full(len(alpha), -1)
    while at.size:
        place[at] = np.arange(at.size)
        on = place[behind]
        hangs = on >= 0
        gained = factor * value[behind]
        value[at] += gained
        place[at] = -1
        on = on[hangs]
        at, factor, behind = at[hangs], factor[hangs] * factor[on], behind[on]
    return value


def _at(powers: Array, share: Array) -> Array:
    """Polynomials, (n, 6) lowest power first, at (n,) shares."""
    value = powers[:, 5] * share
    for power in (4, 3, 2, 1):
        value = (value + powers[:, power]) * share
    return value + powers[:, 0]


def _bernstein(share: Array) -> Array:
    return np.stack([comb(5, i) * share**i * (1.0 - share) ** (5 - i) for i in range(6)], axis=1)


def _goes_nowhere(ways: _Ways) -> NDArray[np.bool_]:
    """Moves whose targets are all where they start."""
    nowhere = np.abs(np.where(np.isnan(ways.target), ways.a, ways.target) - ways.a) <= NO_WAY
    if ways.curved.size:
        start = ways.a[ways.curved, None]
        nowhere[ways.curved] &= np.all(np.abs(np.where(np.isnan(ways.control), start, ways.control) - start) <= NO_WAY, axis=1)
    return nowhere


def _written(
    chains: int,
    chain: Index,
    which: tuple[NDArray[np.bool_], ...],
    times: tuple[Array, ...],
    ways: _Ways,
    line: NDArray[np.int32],
    phrase_line: NDArray[np.int32],
) -> Knots:
    """Knots in order: for each chain one at 0, then for each move its wait, its way, its rest; holds made one."""
    sizes = sum(part.astype(np.int64) for part in which)
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
    for part, when, value in zip(which, times, (ways.a, ways.a, ways.b), strict=True):
        at, move = place[part], np.flatnonzero(part)
        time[at], start[at], made[at], made_of[at] = when[move], value[move], line[move], phrase_line[move]
        if part is which[1]:
            way_of[at] = move
        place += part
    at = np.flatnonzero(way_of >= 0)
    manner[at], shape[at] = _manners(ways, way_of[at])

    # A hold of no length is none, and a hold after a hold is one hold.
    last = first[1:] - 1
    some = np.ones(total, dtype=bool)
    some[:-1] = (manner[:-1] != HOLD) | (time[1:] > time[:-1])
    some[last] = True
    kept = np.flatnonzero(some)
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
    )


def _manners(ways: _Ways, move: Index) -> tuple[NDArray[np.int8], NDArray[np.int8]]:
    """How each move goes, and the shape that it has whole, -1 where it is cut."""
    shape = ways.shape[move].copy()
    manner = np.where(shape == SUDDENLY, SUDDEN, MOVE).astype(np.int8)
    jump = ways.stops[move] <= ways.leaves[move]
    manner[jump] = STEP
    # What is left of a sudden move is a sudden move: as fast as the fiber goes, to where it was cut.
    shape[(ways.share[move] < 1.0) & (shape != SUDDENLY)] = -1
    shape[jump] = NAMES.index("step")
    return manner, shape


def _curves(ways: _Ways, move: Index) -> Array:
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
    if jump.any():
        curve[jump, 1:] = 0.0
        curve[jump, 1] = (ways.b - ways.a)[move[jump]]
    short = share < 1.0
    if short.any():
        curve[short] *= share[short, None] ** np.arange(6)
    return curve
