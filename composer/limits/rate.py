"""The limit of rate: no strain rate above the fastest fill or exhaust at that strain."""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.alike import alike
from composer.limits.duration import STEP_S, duration_ceilings, durations_by_rate, least_durations, speed_range
from composer.limits.limit import TOLERANCE, Limit
from composer.limits.over_tables import worst_over_tables
from composer.limits.polynomials import derivative, search, value, where_positive
from composer.limits.quivering import asked, excess, least_with_quivers, shaken
from composer.limits.snag import Snag
from composer.limits.stretches import NO_PIECES, Pieces, as_snags, gather, picked
from composer.limits.tables import cells, rates, tables_of
from composer.rig.model import Rig
from composer.tracks import MOVE, SAME_INSTANT_S, SUDDEN, Tracks, durations, end_strain, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

SAMPLES = 129
"""Where a table bends the limit, a move that breaks it is sampled so often to find where it does so, then closed in on."""

MANY = 200
SECTIONS = (np.arange(1, 8) / 8.0, np.array([0.5]))
"""Closing in on few places halves the rounds, each of which costs the same, by looking at seven at once; many are halved."""


def least_s(tracks: Tracks, abilities: Abilities, segments: Index | None = None) -> Array:
    """Least seconds of each segment by rate alone, (K,) or one for each of `segments`; as `duration.least_durations`."""
    of = np.arange(len(tracks.time_s)) if segments is None else segments
    least = np.zeros(len(of))
    moves = tracks.manner[of] == MOVE
    at = of[moves]
    least[moves] = durations_by_rate(abilities, fiber_of(tracks)[at], tracks.curve[at], tracks.shape[at])
    least[~moves] = least_durations(tracks, abilities, of[~moves])
    place, by_rate, _ = least_with_quivers(tracks, abilities, of, fiber_of(tracks)[of])
    least[place] = by_rate
    return least


def snags(tracks: Tracks, rig: Rig, abilities: Abilities) -> list[Snag]:
    """Every stretch in which a fiber is asked to go faster than it can: needs its rate where it is worst, has the limit there.

    A jump is told as if made within one tick of 5 ms, and time does not mend it. A `sudden` move with too little time is
    told by the mean rates of the whole of it.
    """
    lasts = durations(tracks)
    ceilings = duration_ceilings(tracks, abilities)
    suspects = np.flatnonzero(lasts * (1.0 + TOLERANCE) < ceilings)
    quivers = _quivers(tracks, abilities, suspects)
    if (shaking := shaken(tracks)) is not None:
        suspects = np.delete(suspects, shaking.of(suspects)[0])
    fiber, least, worst_u = fiber_of(tracks)[suspects], ceilings[suspects], np.full(len(suspects), np.nan)
    moves = tracks.manner[suspects] == MOVE
    at = suspects[moves]
    least[moves] = durations_by_rate(abilities, fiber[moves], tracks.curve[at], tracks.shape[at], exact=False)
    varied = np.flatnonzero(moves & ~abilities.constant[abilities.which[fiber]])
    if len(varied):
        curve = tracks.curve[suspects[varied]]
        one, kind = alike(abilities.which[fiber[varied]].astype(float), curve)
        worst, u = worst_over_tables(abilities, fiber[varied][one], curve[one])
        least[varied], worst_u[varied] = worst[kind], u[kind]
    broken = lasts[suspects] * (1.0 + TOLERANCE) < least
    of, least, worst_u = suspects[broken], least[broken], worst_u[broken]
    manner = tracks.manner[of]
    at_once = (manner != SUDDEN) & ((manner != MOVE) | (lasts[of] <= SAME_INSTANT_S))
    sudden, moves = manner == SUDDEN, (manner == MOVE) & ~at_once
    lots = [
        _jumps(tracks, abilities, of[at_once]),
        _suddens(tracks, of[sudden], least[sudden]),
        _moves(tracks, abilities, of[moves], lasts[of[moves]], worst_u[moves]),
        picked(quivers, quivers.mends),
    ]
    # A quiver too fast by itself is told apart from moves beside it that only lack time.
    alone = as_snags("rate", "1/s", picked(quivers, ~quivers.mends), tracks)
    return as_snags("rate", "1/s", gather(*lots), tracks) + alone


def _quivers(tracks: Tracks, abilities: Abilities, suspects: Index) -> Pieces:
    """The stretches of moves that break the limit with their quivers, at the worst phase.

    A move too fast for its quiver needs its own rate and has what the quiver leaves it; one whose quiver alone is too fast
    needs the quiver's rate, and time does not mend it.
    """
    moves = shaken(tracks)
    row = np.empty(0, dtype=np.int64) if moves is None else moves.of(suspects)[1]
    of = suspects[:0] if moves is None else moves.segment[row]
    fiber, curve, lasts = fiber_of(tracks)[of], tracks.curve[of], durations(tracks)[of]
    worst = asked(abilities, fiber, curve, moves, row) if moves is not None else None
    if moves is None or worst is None:
        return NO_PIECES
    broken = np.flatnonzero((lasts * (1.0 + TOLERANCE) < worst.least_s) & (lasts > SAME_INSTANT_S))
    of, row, fiber, curve, lasts = of[broken], row[broken], fiber[broken], curve[broken], lasts[broken]

    # What a score repeats is closed in on once; lengths that differ in rounding alone are one length.
    swings = (moves.reach[row], moves.speed[row], moves.alone[row].astype(float))
    first, kind = alike(abilities.which[fiber].astype(float), np.round(lasts, 10), curve, *swings)

    def over(one: Index, u: Array) -> Array:
        here = first[one]
        return excess(abilities, fiber[here], curve[here], moves, row[here], lasts[here], u)

    found, start, end = stretches_over(over, worst.u[broken][first])
    which, each = _repeated(found, kind)
    start, end = start[each], end[each]
    mends = np.isfinite(worst.least_s)
    mine = broken[which]
    return Pieces(
        fiber=fiber[which],
        from_s=tracks.time_s[of[which]] + start * lasts[which],
        to_s=tracks.time_s[of[which]] + end * lasts[which],
        needs=np.where(mends[mine], np.abs(worst.speed[mine]) / lasts[which], worst.swing[mine]),
        has=np.where(mends[mine], worst.limit[mine] - worst.swing[mine], worst.limit[mine]),
        knot=of[which],
        mends=mends[mine],
    )


def _jumps(tracks: Tracks, abilities: Abilities, of: Index) -> Pieces:
    fiber = fiber_of(tracks)[of]
    start, end = tracks.curve[of, 0], end_strain(tracks)[of]
    return Pieces(
        fiber=fiber,
        from_s=tracks.time_s[of],
        to_s=tracks.time_s[of],
        needs=np.abs(end - start) / STEP_S,
        has=rates(abilities, fiber, start, end > start),
        knot=of,
        mends=tracks.manner[of] == MOVE,
    )


def _suddens(tracks: Tracks, of: Index, least: Array) -> Pieces:
    lasts = durations(tracks)[of]
    way = np.abs(end_strain(tracks)[of] - tracks.curve[of, 0])
    return Pieces(
        fiber=fiber_of(tracks)[of],
        from_s=tracks.time_s[of],
        to_s=tracks.time_s[of] + lasts,
        needs=way / np.maximum(lasts, SAME_INSTANT_S),
        has=way / least,
        knot=of,
        mends=np.ones(len(of), dtype=bool),
    )


def _moves(tracks: Tracks, abilities: Abilities, of: Index, lasts: Array, worst_u: Array) -> Pieces:
    """The stretches of moves that break the limit, by polynomial roots where it is constant, by closing in elsewhere.

    worst_u: (M,) where each asks the most, for those whose limit is a table.
    """
    fiber, curve = fiber_of(tracks)[of], tracks.curve[of]
    constant = abilities.constant[abilities.which[fiber]]
    needs, has = np.empty(len(of)), np.empty(len(of))
    rows, starts, ends = [], [], []

    same = np.flatnonzero(constant)
    low, high = speed_range(curve[same], tracks.shape[of[same]])
    fill, exhaust = (rates(abilities, fiber[same], curve[same, 0], np.full(len(same), way)) for way in (True, False))
    filling = high / fill >= -low / exhaust
    needs[same] = np.where(filling, high, -low) / lasts[same]
    has[same] = np.where(filling, fill, exhaust)
    # Both ways in one search, which costs little more than one of them: first all that fill, then all that exhaust.
    speed = derivative(curve[same])
    over = np.concatenate([speed, -speed])
    over[:, 0] -= np.concatenate([fill, exhaust]) * np.tile(lasts[same], 2) * (1.0 + 0.5 * TOLERANCE)
    row, start, end = where_positive(over)
    rows.append(np.tile(same, 2)[row])
    starts.append(start)
    ends.append(end)

    varied = np.flatnonzero(~constant)
    if len(varied):
        # What a score repeats is closed in on once; lengths that differ in rounding alone are one length.
        one, kind = alike(abilities.which[fiber[varied]].astype(float), np.round(lasts[varied], 10), curve[varied])
        mine = varied[one]
        worst, speed_curve = worst_u[mine], derivative(curve[mine])
        speed = value(speed_curve, worst)
        needs[varied] = (np.abs(speed) / lasts[mine])[kind]
        has[varied] = rates(abilities, fiber[mine], value(curve[mine], worst), speed > 0.0)[kind]

        def over_table(row: Index, u: Array) -> Array:
            speed, here = value(speed_curve[row], u), mine[row]
            limit = rates(abilities, fiber[here], value(curve[here], u), speed > 0.0)
            return np.abs(speed) - limit * lasts[here] * (1.0 + 0.5 * TOLERANCE)

        row, start, end = stretches_over(over_table, worst, _corners(abilities, fiber[mine], curve[mine]))
        which, each = _repeated(row, kind)
        rows.append(varied[which])
        starts.append(start[each])
        ends.append(end[each])

    row, start, end = np.concatenate(rows), np.concatenate(starts), np.concatenate(ends)
    return Pieces(
        fiber=fiber[row],
        from_s=tracks.time_s[of[row]] + start * lasts[row],
        to_s=tracks.time_s[of[row]] + end * lasts[row],
        needs=needs[row],
        has=has[row],
        knot=of[row],
        mends=np.ones(len(row), dtype=bool),
    )


def stretches_over(
    over: Callable[[Index, Array], Array], worst_u: Array, also: tuple[Index, Array] | None = None
) -> tuple[Index, Array, Array]:
    """The stretches of u in which each of M moves is `over`, above 0, a limit: rows, from and to; `worst_u`, (M,), lies in one.

    over: of rows (n,) and u (n,), values (n,)
    also: rows and u, (p,) each, that are looked at beside even samples, as where a limit has its corners
    """
    count = len(worst_u)
    more_rows, more_u = (np.empty(0, dtype=np.int64), np.empty(0)) if also is None else also
    number = np.concatenate([np.repeat(np.arange(count), SAMPLES), np.arange(count), more_rows])
    u = np.concatenate([np.tile(np.linspace(0.0, 1.0, SAMPLES), count), worst_u, more_u])
    order = np.lexsort((u, number))
    number, u = number[order], u[order]
    broken = over(number, u) > 0.0
    first = np.append(True, number[1:] != number[:-1])[: len(number)]
    last = np.append(first[1:], True)[: len(number)]
    change = np.flatnonzero((broken[1:] != broken[:-1]) & ~first[1:])
    row, low, high, begins = number[change], u[change], u[change + 1], broken[change + 1]
    sections = SECTIONS[len(row) > MANY]
    for _ in range(int(np.ceil(40.0 / np.log2(len(sections) + 1)))):
        at = low + np.multiply.outer(sections, high - low)
        past = (over(np.tile(row, len(sections)), at.ravel()) > 0.0).reshape(at.shape) != begins
        gone = past.all(axis=0)
        place = np.where(gone, len(sections), past.argmin(axis=0))
        edges = np.vstack([low, at, high])
        low, high = np.take_along_axis(edges, np.array([place, place + 1]), 0)
    edge = 0.5 * (low + high)
    from_row = np.concatenate([number[first & broken], row[begins]])
    start = np.concatenate([np.zeros(np.count_nonzero(first & broken)), edge[begins]])
    to_row = np.concatenate([row[~begins], number[last & broken]])
    end = np.concatenate([edge[~begins], np.ones(np.count_nonzero(last & broken))])
    by_start, by_end = np.lexsort((start, from_row)), np.lexsort((end, to_row))
    return from_row[by_start], start[by_start], end[by_end]


def _repeated(found: Index, kind: Index) -> tuple[Index, Index]:
    """What was found for kinds, in order of these, for each of the rows that are of them: the rows, and which of the found."""
    begins = np.searchsorted(found, np.arange(kind.max(initial=-1) + 2))
    count = np.diff(begins)[kind]
    return np.arange(len(kind)).repeat(count), np.repeat(begins[kind] - np.cumsum(count) + count, count) + np.arange(
        count.sum()
    )


def _corners(abilities: Abilities, fiber: Index, curve: Array) -> tuple[Index, Array]:
    """Where the strain of moves passes the points of their tables, at which a limit may be lowest: rows, and u."""
    tables = tables_of(abilities)
    u = np.linspace(0.0, 1.0, SAMPLES)
    strain = curve @ np.vander(u, curve.shape[1], increasing=True).T
    cell = cells(abilities, np.broadcast_to(fiber[:, None], strain.shape), strain)
    passed = np.abs(np.diff(cell, axis=1))
    row, stretch = np.nonzero(passed)
    count = passed[row, stretch]
    which = np.arange(count.sum()) - np.repeat(np.cumsum(count) - count, count)
    row, stretch = np.repeat(row, count), np.repeat(stretch, count)
    shifted = curve[row].copy()
    shifted[:, 0] -= tables.fill.strain[np.minimum(cell[row, stretch], cell[row, stretch + 1]) + 1 + which]
    low = u[stretch]
    return row, search(shifted, low, u[stretch + 1], value(shifted, low))


LIMIT = Limit("rate", "1/s", "no strain rate above the fastest fill or exhaust at that strain", snags, least_s)
