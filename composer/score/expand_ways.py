"""The way of every move: from which strain to which, and when, cut where a later entry takes over."""

from dataclasses import dataclass
from functools import lru_cache
from math import comb

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.tables import strain_after, travel_time_s
from composer.score.expand_lines import HELD, TARGET_UNITS, Lines
from composer.score.expand_starts import Starts
from composer.score.expand_times import Moments
from composer.shapes import NAMES, PROGRESS
from composer.tracks import SAME_INSTANT_S

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


def in_strain(value: Array, unit: NDArray[np.int8], fiber: Index, abilities: Abilities) -> Array:
    """Targets in strain; 0 for `hold`."""
    return value * _strain_per(abilities)[unit, fiber]


@lru_cache(maxsize=8)
def _strain_per(abilities: Abilities) -> Array:
    """(unit, fiber): the strain of one of each unit, in the order of TARGET_UNITS; kept for the abilities last used."""
    per = np.zeros((len(TARGET_UNITS), len(abilities.stroke)))
    per[0], per[1], per[2], per[3] = abilities.stroke, 0.01, 1.0 / abilities.length_mm, 1.0 / abilities.turn_deg
    return per


@dataclass(slots=True, eq=False)
class Ways:
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


NONE_CURVED = np.empty(0, dtype=np.int64), np.empty((0, 4))
"""Rows and control values of no moves."""


def ways_of(found: Moments, starts: Starts, lines: Lines, abilities: Abilities, keep: Index) -> Ways:
    """The ways of the moves `keep` of some moments. Every fiber has the units of its targets: `check_names` has seen to it."""
    ways = _ways(found, starts, lines, abilities, keep)
    _solve_values(ways, abilities)
    _start_suddens(ways, abilities)
    return ways


def _ways(found: Moments, starts: Starts, lines: Lines, abilities: Abilities, keep: Index) -> Ways:
    instance, row = found.instance[keep], found.row[keep]
    which = found.order[instance]
    fiber, scale, shape = starts.fiber[which], starts.scale[which], lines.shape[row]
    leaves, arrives, cut = found.leaves[keep], found.arrives[keep], found.cut[instance]
    unit = lines.unit[row]
    held = unit == HELD
    target = in_strain(lines.value[row], unit, fiber, abilities) * scale
    target[held] = np.nan
    curved, control = NONE_CURVED
    if np.count_nonzero(bends := shape == CURVE):
        curved = bends.nonzero()[0]
        units = lines.control_unit[row[curved]]
        control = in_strain(lines.control[row[curved]], units, fiber[curved, None], abilities) * scale[curved, None]
        control[units == HELD] = np.nan
    stops = np.minimum(arrives, cut)
    goes = (leaves < cut) | ((leaves == arrives) & (leaves <= cut))
    goes &= ~held | bends
    short = ((stops < arrives) & goes).nonzero()[0]
    share = np.ones(len(keep))
    share[short] = (stops[short] - leaves[short]) / (arrives[short] - leaves[short])
    leads = np.ones(len(keep), dtype=bool)
    chain = found.chain[instance]
    leads[1:] = chain[1:] != chain[:-1]
    empty = np.zeros(len(keep))
    return Ways(fiber, leads, leaves, leaves.copy(), arrives, stops, goes, share, shape, target, curved, control, empty, empty)


def _solve_values(ways: Ways, abilities: Abilities) -> None:
    """Where each move starts and ends: b = alpha * a + beta, each starting where the one before ended, 0 at first.

    Only a `sudden` that is cut is no such line; where it is cut is worked out from where it starts, again until nothing
    changes. A round settles at least the first of a row that still changes, so it ends; as a rule after two or three.
    """
    whole = ways.share == 1.0
    short = (~whole).nonzero()[0]
    gone = np.ones(len(whole))
    gone[short] = _at(POWERS[ways.shape[short]], ways.share[short])
    alpha = np.where(ways.goes & (ways.target == ways.target), 1.0 - gone, 1.0)
    beta = np.where(alpha == 1.0, 0.0, ways.target * gone)
    if ways.curved.size:
        at = ways.curved[ways.goes[ways.curved]]
        control = ways.control[ways.goes[ways.curved]]
        weights = np.where(whole[at, None], np.eye(6)[5], _bernstein(ways.share[at]))
        inner = np.column_stack([np.full(len(at), np.nan), control, ways.target[at]])
        held = np.isnan(inner)
        alpha[at] = np.sum(np.where(held, weights, 0.0), axis=1)
        beta[at] = np.sum(np.where(held, 0.0, weights * np.nan_to_num(inner)), axis=1)
    cut = short[(ways.shape[short] == SUDDENLY) & ways.goes[short]]
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


def _cut_sudden(ways: Ways, abilities: Abilities, cut: Index, a: Array) -> Array:
    """The strain that a sudden move which starts from `a` has where it is cut."""
    fiber, target = ways.fiber[cut], ways.target[cut]
    needs, has = travel_time_s(abilities, fiber, a, target), ways.arrives[cut] - ways.leaves[cut]
    begins = np.maximum(ways.leaves[cut], ways.arrives[cut] - needs)
    # Where there is less time than needed it runs through the same way faster.
    faster = np.where(needs > has, needs / has, 1.0)
    gone = ways.stops[cut] - begins
    return np.where(gone <= SAME_INSTANT_S, a, strain_after(abilities, fiber, a, target, np.maximum(0.0, gone) * faster))


def _start_suddens(ways: Ways, abilities: Abilities) -> None:
    """A sudden move starts as late as it can: its leave becomes that instant."""
    sudden = ((ways.shape == SUDDENLY) & ways.goes & (ways.arrives > ways.leaves)).nonzero()[0]
    if not sudden.size:
        return
    needs = travel_time_s(abilities, ways.fiber[sudden], ways.a[sudden], ways.target[sudden])
    begins = ways.arrives[sudden] - needs
    early = ways.leaves[sudden]
    begins = np.where(begins <= early + SAME_INSTANT_S, early, begins)
    ways.leaves[sudden] = np.minimum(begins, ways.stops[sudden])
    ways.goes[sudden] &= (ways.leaves[sudden] < ways.stops[sudden]) & (np.abs(ways.b[sudden] - ways.a[sudden]) > NO_WAY)


def affine_scan(alpha: Array, beta: Array) -> Array:
    """All v[i] = alpha[i] v[i - 1] + beta[i], alpha[0] being 0: pointer doubling (Hillis and Steele 1986).

    Only what still hangs on an earlier value is worked on, so its cost is that of the longest run of holds and cuts.
    """
    value = beta.copy()
    at = alpha.nonzero()[0]
    if not at.size:
        return value
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


def goes_nowhere(ways: Ways) -> NDArray[np.bool_]:
    """Moves whose targets are all where they start."""
    nowhere = np.abs(np.where(np.isnan(ways.target), ways.a, ways.target) - ways.a) <= NO_WAY
    if ways.curved.size:
        start = ways.a[ways.curved, None]
        nowhere[ways.curved] &= np.all(np.abs(np.where(np.isnan(ways.control), start, ways.control) - start) <= NO_WAY, axis=1)
    return nowhere
