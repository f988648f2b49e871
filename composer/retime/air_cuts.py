"""Rows for the shared air: those over whole moves, true for every timing, and those that fit the times at hand.

A span between two hits draws at least what the moves draw that can lie nowhere else: such rows bound the cost from below. A
move that lies partly in a span counts by its share, which depends on the answer: such rows are the demand made linear
about the times at hand, and lead, round by round, to times that the checker finds clean.
"""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from composer.limits.abilities import Abilities
from composer.limits.air import refill_L_s, store_L, use
from composer.limits.fills import Fills, drawn, fills_of
from composer.limits.quivering import shaken
from composer.retime.events import Events
from composer.retime.rows import AIR_ROW, Rows, differences, joined, no_rows
from composer.rig.model import Rig
from composer.tracks import Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

Span = tuple[float, float]

AT_ONCE, WIDEST = 20, 400
"""Rows over whole moves added for one span in one round, and hits looked at round a span."""

CLEAN = 5e-7
"""Share of the store by which times made clean stay within what the checker lets pass."""

MARGIN = 1e-7
"""Share of the store that is kept back, well within what the checker lets pass."""


def overdrawn(now: Tracks, rig: Rig, abilities: Abilities) -> tuple[list[Span], Array]:
    """The spans, from and to in s, in which tracks with the times at hand ask for too much air; none where nothing refills.

    Returns as well instants, in order, at which the receiver is full; none are told where it never runs short.
    """
    if refill_L_s(rig.supply) <= 0.0:
        return [], np.empty(0)
    fills = fills_of(now, abilities)
    if fills.litres.sum() <= store_L(rig.supply):
        return [], np.empty(0)
    there = use(now, rig.supply, abilities, fills)
    return [(from_s, to_s) for from_s, to_s, _, _ in there.spans], there.full_s


def overdraft_L(now: Tracks, rig: Rig, abilities: Abilities) -> float:
    """By how many litres the deepest span overdraws the store, 0 where that is well within what the checker lets pass."""
    supply = rig.supply
    higher = CLEAN * (supply.max_receiver_kPa - supply.min_pressure_kPa)
    spans = use(now, replace(supply, min_pressure_kPa=supply.min_pressure_kPa + higher), abilities).spans
    return max((asked - bears for _, _, asked, bears in spans), default=0.0)


def plainly_enough(now: Tracks, moves_L: float, rig: Rig, abilities: Abilities) -> bool:
    """Whether a full receiver alone bears all that is drawn; moves_L: what the moves draw without their quivers."""
    quivers = now.quivers
    steepest = (np.diff(abilities.air_L, axis=1) / np.diff(abilities.strain, axis=1)).max(axis=1)[abilities.which]
    lasts = now.time_s[quivers.until] - now.time_s[quivers.knot]
    # In each period, and in one begun, a quiver climbs from its lowest to its highest.
    climbs = 2.0 * quivers.amplitude * (quivers.hertz * lasts + 1.0)
    return moves_L + float(climbs @ steepest[fiber_of(now)[quivers.knot]]) <= store_L(rig.supply)


def whole_rows(
    spans: list[Span], now: Tracks, events: Events, shift_s: Array, rig: Rig, abilities: Abilities, known: set[tuple[int, int]]
) -> Rows:
    """Rows over whole moves between two hits (-1: the start) round some spans, that the displacements at hand break."""
    fills = fills_of(now, abilities)
    store, refill = store_L(rig.supply), refill_L_s(rig.supply)
    # A move after a hold can start no earlier than the hold; one after a move, no earlier than that move's hit.
    begins = events.event[np.where(events.arrival[fills.segment], fills.segment, np.maximum(fills.segment - 1, 0))]
    first = np.isin(fills.segment, now.first[:-1])
    begins = np.where(first, -1, begins)
    ends = events.event[fills.segment + 1]
    # What a quiver draws hangs on how long it lasts, so no row over all timings may count it.
    moves = shaken(now)
    steady = np.ones(len(ends), dtype=bool) if moves is None else ~np.isin(fills.segment, moves.segment)
    hits_s = events.written_s[: events.hits] + shift_s[: events.hits]
    pairs: list[tuple[int, int, float]] = []
    for from_s, to_s in spans:
        about = 0.25 * (to_s - from_s) + 0.1
        low = int(np.searchsorted(hits_s, from_s - about)) - 1
        # Where a span lies before the first hit, its fills still have to be done by then.
        high = min(max(int(np.searchsorted(hits_s, to_s + about)), 1), events.hits, low + WIDEST)
        if not high:
            continue
        found = []
        for a in range(low, high):
            inside = steady & (begins >= a) & (ends > a) & (ends < high)
            litres = np.cumsum(np.bincount(ends[inside] - a, weights=fills.litres[inside], minlength=high - a))
            lasts = hits_s[max(a, 0) : high] - (hits_s[a] if a >= 0 else 0.0)
            need = (litres[-len(lasts) :] - store) / refill
            b = int(np.argmax(need - lasts))
            hit = max(a, 0) + b
            if need[b] - lasts[b] > 1e-9 and (a, hit) not in known:
                found.append((need[b] - lasts[b], a, hit, need[b]))
        for _, a, b, need in sorted(found, reverse=True)[:AT_ONCE]:
            known.add((a, b))
            pairs.append((a, b, float(need)))
    if not pairs:
        return no_rows(events)
    earlier, later, least = (np.array(part) for part in zip(*pairs, strict=True))
    written = np.append(events.written_s, 0.0)
    return differences(
        events, later, earlier, least - (written[later] - written[earlier]), AIR_ROW, np.full(len(pairs), -1, dtype=np.int64)
    )


def share_rows(spans: list[Span], now: Tracks, events: Events, shift_s: Array, rig: Rig, abilities: Abilities) -> Rows:
    """For each span its demand, made linear about the times at hand, at most what store and compressor give over it."""
    fills = fills_of(now, abilities)
    rows = [_share_row(span, fills, now, events, shift_s, rig, abilities) for span in spans]
    return joined(rows) if rows else no_rows(events)


def _share_row(span: Span, fills: Fills, now: Tracks, events: Events, shift_s: Array, rig: Rig, abilities: Abilities) -> Rows:
    """One row. Both ends of the span hang from the fill that draws most there, so a span that begins or ends with a move does
    so wherever that move goes; where the flow changes smoothly, any fill would give the same row to first order."""
    refill = refill_L_s(rig.supply)
    slope = np.zeros(len(events.written_s) + 1)
    asked = 0.0
    for instant, sign in ((span[1], 1.0), (span[0], -1.0)):
        beside = instant - sign * 1e-6
        under_way = np.flatnonzero((fills.from_s < beside) & (fills.to_s > beside))
        every = np.arange(len(fills.litres))
        asked += sign * float(drawn(now, abilities, fills, every, np.full(len(every), instant)).sum())
        if not len(under_way):
            continue
        step = np.full(len(under_way), 5e-7)
        flow = drawn(now, abilities, fills, under_way, beside + step) - drawn(now, abilities, fills, under_way, beside - step)
        flow /= 1e-6
        segment = fills.segment[under_way]
        start, end = now.time_s[segment], now.time_s[segment + 1]
        share = np.clip((instant - start) / np.maximum(end - start, 1e-12), 0.0, 1.0)
        most = int(np.argmax(flow))

        def hang(n: int, factor: float, segment: Index = segment, share: Array = share) -> None:
            slope[events.event[segment[n]]] += factor * (1.0 - share[n])
            slope[events.event[segment[n] + 1]] += factor * share[n]

        hang(most, sign * (float(flow.sum()) - refill))
        for n in range(len(under_way)):
            hang(n, -sign * float(flow[n]))
    over = asked - refill * (span[1] - span[0]) - store_L(rig.supply) * (1.0 - MARGIN)
    slope[np.abs(slope) < 1e-12] = 0.0
    # The last place stands for what is fixed at 0 s.
    columns = np.flatnonzero(slope[:-1])
    # In seconds, as all other rows: litres over the refill.
    matrix = sparse.csr_array(
        (-slope[columns] / refill, (np.zeros(len(columns), dtype=np.int64), columns)), shape=(1, len(events.written_s))
    )
    least = (over - float(slope[columns] @ shift_s[columns])) / refill
    return Rows(matrix, np.array([least]), np.array([AIR_ROW], dtype=np.int8), np.array([-1]))
