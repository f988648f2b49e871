"""What fibers draw from the supply: one fill for each stretch in which a fiber's strain rises, in litres of free air."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import STEP_S, one_way
from composer.limits.polynomials import derivative, value, where_positive
from composer.limits.quivering import Shaken, shaken
from composer.limits.swings import climb_of, strain_of, stretches
from composer.limits.tables import cells, strain_after, tables_of, travel_time_s
from composer.tracks import HOLD, MOVE, SAME_INSTANT_S, STEP, SUDDEN, Tracks, durations, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Fills:
    """Stretches of rising strain, (P,) each, in order of fiber and time.

    fiber, segment: whose, and in which segment of the tracks; u_from, u_to: the shares of its curve between which it rises
    from_s, to_s: the stretch in time; litres: what it draws in all, for a bundle all of its fibers together
    at_once: a jump, which is taken to draw evenly over one tick of 5 ms
    """

    fiber: Index
    segment: Index
    u_from: Array
    u_to: Array
    from_s: Array
    to_s: Array
    litres: Array
    at_once: NDArray[np.bool_]


def air_at(abilities: Abilities, fiber: Index, strain: Array) -> Array:
    """Litres of free air that each fiber draws in filling from rest to each strain, any one shape; past its table no more."""
    tables = tables_of(abilities)
    first = abilities.which[fiber] * tables.points
    points, litres = tables.fill.strain, abilities.air_L.ravel()
    at = cells(abilities, fiber, strain)
    held = np.minimum(np.maximum(strain, points[first]), points[first + tables.points - 1])
    return litres[at] + (litres[at + 1] - litres[at]) * (held - points[at]) / (points[at + 1] - points[at])


def fills_of(tracks: Tracks, abilities: Abilities) -> Fills:
    """All fills of the tracks. Exhausting draws nothing, and what a fiber lets out is not given back."""
    rise = tracks.curve[:, 1:].sum(axis=1)
    straight_on = one_way(tracks)
    whole = np.flatnonzero((tracks.manner != HOLD) & straight_on & (rise > 0.0))
    own = np.flatnonzero((tracks.manner == MOVE) & ~straight_on)
    moves = shaken(tracks)
    quivers, up_from, up_to = (own[:0], np.empty(0), np.empty(0)) if moves is None else _upstrokes(tracks, moves)
    if moves is not None:
        whole, own = np.setdiff1d(whole, moves.segment), np.setdiff1d(own, moves.segment)
    row, start, end = where_positive(derivative(tracks.curve[own]))
    segment = np.concatenate([whole, own[row], quivers])
    u_from = np.concatenate([np.zeros(len(whole)), start, up_from])
    u_to = np.concatenate([np.ones(len(whole)), end, up_to])
    order = np.lexsort((u_from, segment))
    segment, u_from, u_to = segment[order], u_from[order], u_to[order]

    fiber, lasts = fiber_of(tracks)[segment], durations(tracks)[segment]
    at_once = (tracks.manner[segment] == STEP) | (lasts <= SAME_INSTANT_S)
    from_s = tracks.time_s[segment] + np.where(at_once, 0.0, u_from * lasts)
    to_s = tracks.time_s[segment] + np.where(at_once, STEP_S, u_to * lasts)
    litres = air_at(abilities, fiber, strain_of(tracks, segment, u_to))
    litres -= air_at(abilities, fiber, strain_of(tracks, segment, u_from))
    some = litres > 0.0
    return Fills(*(x[some] for x in (fiber, segment, u_from, u_to, from_s, to_s, litres, at_once)))


def _upstrokes(tracks: Tracks, moves: Shaken) -> tuple[Index, Array, Array]:
    """Every stretch in which a move that quivers rises: segment, and shares of its time."""
    row = np.arange(len(moves.segment))
    which, start, end = stretches(tracks, moves, row, lambda one, u: climb_of(tracks, moves.segment[one], u))
    return moves.segment[which], start, end


def drawn_together(tracks: Tracks, abilities: Abilities, fills: Fills, which: Index) -> Callable[[Array], Array]:
    """What some fills, (M,), draw together from their start up to some instants: of instants, (N,), litres, (N,).

    Each is worked out at every instant; what does not change from one call to the next is gathered once.
    """
    manner = tracks.manner[fills.segment[which]]
    if len(tracks.quivers) or np.any(fills.at_once[which] | (manner == SUDDEN)):
        return lambda time_s: (
            drawn(tracks, abilities, fills, np.repeat(which, len(time_s)), np.tile(time_s, len(which)))
            .reshape(len(which), len(time_s))
            .sum(axis=0)
        )
    fiber, curve = fills.fiber[which][:, None], tracks.curve[fills.segment[which]]
    from_s, lasts = fills.from_s[which][:, None], (fills.to_s - fills.from_s)[which][:, None]
    u_from, rise = fills.u_from[which][:, None], (fills.u_to - fills.u_from)[which][:, None]
    before = air_at(abilities, fiber, value(curve, u_from)).sum()

    def litres(time_s: Array) -> Array:
        share = np.minimum(np.maximum((time_s - from_s) / lasts, 0.0), 1.0)
        return air_at(abilities, fiber, value(curve, u_from + share * rise)).sum(axis=0) - before

    return litres


def drawn(tracks: Tracks, abilities: Abilities, fills: Fills, which: Index, time_s: Array) -> Array:
    """Litres drawn by some fills from their start up to some instants, (N,) each; nothing before, all of it after."""
    fiber, segment = fills.fiber[which], fills.segment[which]
    share = np.clip((time_s - fills.from_s[which]) / (fills.to_s[which] - fills.from_s[which]), 0.0, 1.0)
    curve, u_from = tracks.curve[segment], fills.u_from[which]
    strain = strain_of(tracks, segment, u_from + share * (fills.u_to[which] - u_from))
    sudden = np.flatnonzero((tracks.manner[segment] == SUDDEN) & ~fills.at_once[which])
    if len(sudden):
        start, end = curve[sudden, 0], curve[sudden].sum(axis=1)
        strain[sudden] = sudden_strain(abilities, fiber[sudden], start, end, share[sudden])
    litres = air_at(abilities, fiber, strain) - air_at(abilities, fiber, strain_of(tracks, segment, u_from))
    litres = np.where(fills.at_once[which], share * fills.litres[which], litres)
    return np.where(share >= 1.0, fills.litres[which], np.where(share <= 0.0, 0.0, litres))


def sudden_strain(abilities: Abilities, fiber: Index, start: Array, end: Array, share: Array) -> Array:
    """Strain of a `sudden` move after a share of its time; one with too little time runs through the same way faster."""
    return strain_after(abilities, fiber, start, end, share * travel_time_s(abilities, fiber, start, end))
