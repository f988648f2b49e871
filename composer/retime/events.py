"""From tracks to the unknowns of the programme: hits that fibers share, and the free starts of their moves."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.quivers import pairs
from composer.shapes import NAMES
from composer.tracks import HOLD, MOVE, SAME_INSTANT_S, STEP, SUDDEN, Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]

LEAD_SHARE = 1.0 / 20.0
"""What a second of a free start's displacement costs, over what it would cost a hit."""


@dataclass(frozen=True, slots=True, eq=False)
class Events:
    """The unknowns: H hits first, in order, then S free starts; N = H + S. A knot hangs from one of them.

    hits: H; written_s: (N,) instants as written
    weight: (N,) what a second of displacement costs, in strokes, the lead share of a start already in it
    place: (N,) rank in time as written, such that no row runs against it
    own_hit: (N,) the hit that a start's move lands in; a hit's own number for a hit
    event, offset_s: (K,) the event that each knot hangs from (-1: fixed at 0 s) and how much later than it the knot is
    arrival, free: (K,) whether some move lands at the knot; whether the knot is a free start
    """

    hits: int
    written_s: Array
    weight: Array
    place: Index
    own_hit: Index
    event: Index
    offset_s: Array
    arrival: Flags
    free: Flags


def with_waits(tracks: Tracks) -> tuple[Tracks, Index]:
    """The tracks with a hold of no length before each `sudden` or `step` that follows a move or begins a track.

    Such a move starts so late that it arrives in time, so it can wait where the tracks as written leave nothing to wait
    in. Returns the new tracks, and for each of their knots the knot of the tracks given, (K',); a hold put in names the
    knot of the move that it waits for.
    """
    tied = (tracks.manner == SUDDEN) | (tracks.manner == STEP)
    before = np.concatenate(([HOLD], tracks.manner[:-1]))
    begins = np.zeros(len(tied), dtype=bool)
    begins[tracks.first[:-1]] = True
    need = np.flatnonzero(tied & ((before != HOLD) | begins))
    origin = np.arange(len(tied))
    if not len(need):
        return tracks, origin
    origin = np.insert(origin, need, need)
    put_in = need + np.arange(len(need))
    curve = tracks.curve[origin]
    curve[put_in, 1:] = 0.0
    manner, shape = tracks.manner[origin], tracks.shape[origin]
    manner[put_in], shape[put_in] = HOLD, -1
    return replace(
        tracks,
        first=tracks.first + np.searchsorted(need, tracks.first, side="left"),
        time_s=tracks.time_s[origin],
        curve=curve,
        manner=manner,
        shape=shape,
        line=tracks.line[origin],
        phrase_line=tracks.phrase_line[origin],
        quivers=replace(
            tracks.quivers,
            knot=tracks.quivers.knot + np.searchsorted(need, tracks.quivers.knot, side="right"),
            until=tracks.quivers.until + np.searchsorted(need, tracks.quivers.until, side="left"),
        ),
    ), origin


def strain_gone(tracks: Tracks, segments: Index | None = None) -> Array:
    """Strain that each segment, or each of `segments`, goes through, back and forth added up; |b - a| where it goes one way.

    A quiver adds what it goes through in one period, however long it lasts.
    """
    chosen = np.arange(len(tracks.time_s)) if segments is None else segments
    curve, shape = tracks.curve[chosen], tracks.shape[chosen]
    gone = np.abs(curve[:, 1:].sum(axis=1))
    # Whole named shapes go one way, and so does a polynomial whose rate has coefficients of one sign.
    rate = curve[:, 1:] * np.arange(1.0, 6.0)
    whole = (shape >= 0) & (shape != NAMES.index("curve"))
    bent = np.flatnonzero(~whole & (rate.min(axis=1) < 0.0) & (rate.max(axis=1) > 0.0))
    if len(bent):
        scale = np.abs(rate[bent]).max(axis=1, keepdims=True)
        alike, back = np.unique(np.round(rate[bent] / scale, 12), axis=0, return_inverse=True)
        gone[bent] = np.array([_variation(row) for row in alike])[back.ravel()] * scale[:, 0]
    if len(tracks.quivers):
        segment, which = pairs(tracks.quivers)
        moves = tracks.manner[segment] == MOVE
        gone += np.bincount(segment[moves], 4.0 * tracks.quivers.amplitude[which[moves]], minlength=len(tracks.time_s))[chosen]
    return gone


def _variation(rate: Array) -> float:
    """The integral of |polynomial| over [0, 1]; coefficients lowest power first."""
    turns = np.polynomial.polynomial.polyroots(np.trim_zeros(rate, "b"))
    turns = np.sort(turns.real[(np.abs(turns.imag) < 1e-9) & (turns.real > 0.0) & (turns.real < 1.0)])
    whole = np.concatenate(([0.0], rate / np.arange(1.0, len(rate) + 1.0)))
    stops = np.polynomial.polynomial.polyval(np.concatenate(([0.0], turns, [1.0])), whole)
    return float(np.abs(np.diff(stops)).sum())


def events_of(
    tracks: Tracks, abilities: Abilities, least_s: Array, firm: Array | None = None, gone: Array | None = None
) -> Events:
    """The events of tracks that `with_waits` has prepared.

    least_s: (K,) least duration of each segment, finite; that of a `sudden` is how long it lasts
    firm: (K,) how many times as costly each segment is to move, None: all alike; gone: (K,) as `strain_gone`, where known
    """
    knots = len(tracks.time_s)
    fiber = fiber_of(tracks)
    begins = np.zeros(knots, dtype=bool)
    begins[tracks.first[:-1]] = True
    moving = tracks.manner != HOLD
    arrival = np.concatenate(([False], moving[:-1])) & ~begins
    tied = ~begins & ~arrival & ((tracks.manner == SUDDEN) | (tracks.manner == STEP))
    free = ~begins & ~arrival & ~tied

    cluster = _clusters(tracks.time_s)
    level = _levels(least_s, cluster, begins)
    landed = np.flatnonzero(arrival)
    keys, hit = np.unique(np.column_stack((cluster[landed], level[landed])), axis=0, return_inverse=True)
    hit = hit.ravel()
    hits, starts = len(keys), np.flatnonzero(free)

    event = np.full(knots, -1, dtype=np.int64)
    event[landed] = hit
    event[starts] = hits + np.arange(len(starts))
    offset = np.zeros(knots)
    waits = np.flatnonzero(tied)
    event[waits] = event[waits + 1]
    offset[waits] = -least_s[waits]

    written = np.empty(hits + len(starts))
    written[:hits] = np.inf
    np.minimum.at(written, hit, tracks.time_s[landed])
    written[hits:] = tracks.time_s[starts]

    heavy = (strain_gone(tracks) if gone is None else gone) / abilities.stroke[fiber] * (1.0 if firm is None else firm)
    weight = np.empty(len(written))
    weight[:hits] = np.bincount(hit, weights=heavy[landed - 1], minlength=hits)
    weight[hits:] = heavy[starts] * LEAD_SHARE

    own = np.arange(len(written))
    leads = moving[starts]
    own[hits:][leads] = event[starts[leads] + 1]
    sort = np.lexsort(
        (
            np.arange(len(written)) >= hits,
            np.concatenate((keys[:, 1], level[starts])),
            np.concatenate((keys[:, 0], cluster[starts])),
        )
    )
    place = np.empty(len(written), dtype=np.int64)
    place[sort] = np.arange(len(written))
    return Events(hits, written, weight, place, own, event, offset, arrival, free)


def _clusters(time_s: Array) -> Index:
    """The rank of each knot's instant among all instants; those closer than one instant share it, (K,)."""
    order = np.argsort(time_s, kind="stable")
    rank = np.empty(len(time_s), dtype=np.int64)
    rank[order] = np.concatenate(([0], np.cumsum(np.diff(time_s[order]) > SAME_INSTANT_S)))
    return rank


def _levels(least_s: Array, cluster: Index, begins: Flags) -> Index:
    """How many of its fiber's moves end, one after another, within a knot's own instant, up to that knot, (K,).

    Moves without length as written that take time must be made one after another, so their ends are hits of their own.
    """
    same = np.concatenate(([False], cluster[1:] == cluster[:-1])) & ~begins
    ends = np.cumsum(same & (np.concatenate(([0.0], least_s[:-1])) > 0.0))
    opening = np.maximum.accumulate(np.where(same, 0, np.arange(len(same))))
    return ends - ends[opening]


def knot_times(events: Events, shift_s: Array, tracks: Tracks) -> Array:
    """New time of each knot of prepared tracks, (K,), for a displacement of each event, (N,); unmoved ones as written."""
    at = np.maximum(events.event, 0)
    moved = (events.event >= 0) & (shift_s[at] != 0.0) if len(shift_s) else np.zeros(len(at), dtype=bool)
    if not len(shift_s):
        return tracks.time_s.copy()
    hung = events.written_s[at] + shift_s[at] + events.offset_s
    # A tied start that lies where it belongs keeps its written bits too.
    stays = ~moved & ((events.offset_s == 0.0) | (np.abs(hung - tracks.time_s) <= SAME_INSTANT_S))
    times = np.where((events.event < 0) | stays, tracks.time_s, hung)
    # What is left of a hold may come out a rounding below nothing.
    starts = np.flatnonzero(events.free | (events.offset_s != 0.0))
    times[starts] = np.maximum(times[starts], times[starts - 1])
    return times
