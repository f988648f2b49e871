"""Solving a programme: rows added until the times break none, and rows given up that no times can keep."""

from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import least_durations
from composer.retime.air_cuts import overdrawn, share_rows, whole_rows
from composer.retime.cuts import duty_rows, duty_spans
from composer.retime.events import Events, events_of, knot_times, with_waits
from composer.retime.hold import hold_rows
from composer.retime.local import Least, least_cost
from composer.retime.rows import ABOVE_ROW, AIR_ROW, Rows, duration_rows, joined, no_rows, order_rows, picked, pin_rows
from composer.retime.terms import Terms, all_terms
from composer.rig.model import Rig
from composer.tracks import MOVE, STEP, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]

ROUNDS = 200
"""How many rounds of cutting planes are tried; each adds at least one row that the times at hand break."""

AIR_ROUNDS = 40
"""How many rounds close in on times that keep the air before what is left is reported as it is."""

GIVEN_UP_S = 1e-6
"""A row that even at a high price stays broken by more than this is one that no times can keep."""

CLOSER, CLOSER_ROUNDS, NEAR = 12, 12, 0.05
"""Where air is short: how often a clean answer is bettered, in how many rounds each, and what share of the store is near."""


@dataclass(frozen=True, slots=True, eq=False)
class Programme:
    """The whole programme of some tracks.

    tracks: prepared by `with_waits`; origin (K',) where their knots come from; rhythm (N,) which events keep rhythm
    end: what the score's end hangs from, event and offset (-1: an instant)
    """

    tracks: Tracks
    origin: Index
    least_s: Array
    events: Events
    rows: Rows
    terms: Terms
    rhythm: Flags = field(repr=False)
    end: tuple[int, float]


@dataclass(frozen=True, slots=True, eq=False)
class Answer:
    """The optimum found, the rows that it was found with, and how many rows no times could keep."""

    least: Least
    rows: Rows
    given_up: int


def programme_of(
    tracks: Tracks, abilities: Abilities, pins_s: Array, give_s: Array, firm: Array | None, rhythm: bool | Flags
) -> Programme:
    """The programme of tracks; pins in order of time, firm and rhythm as `retime` takes them."""
    prepared, origin = with_waits(tracks)
    least = durations_to_keep(prepared, abilities)
    events = events_of(prepared, abilities, least, None if firm is None else firm[origin])
    keeps = _rhythm_of(events, origin, rhythm)
    last = events.hits - 1
    end = (last, tracks.duration_s - events.written_s[last]) if last >= 0 and keeps[last] else (-1, tracks.duration_s)
    rows = joined(
        [
            duration_rows(prepared, events, least),
            order_rows(events),
            pin_rows(events, pins_s, give_s),
            hold_rows(prepared, events, abilities),
        ]
    )
    return Programme(prepared, origin, least, events, rows, all_terms(events, keeps), keeps, end)


def durations_to_keep(tracks: Tracks, abilities: Abilities, segments: Index | None = None) -> Array:
    """Least durations as the programme keeps them: a jump takes no time, and what no time mends keeps what it has."""
    least = least_durations(tracks, abilities, segments)
    where = np.arange(len(tracks.time_s)) if segments is None else segments
    least[tracks.manner[where] == STEP] = 0.0
    endless = np.flatnonzero(~np.isfinite(least) & (tracks.manner[where] == MOVE))
    least[endless] = tracks.time_s[where[endless] + 1] - tracks.time_s[where[endless]]
    return np.where(np.isfinite(least), least, 0.0)


def _rhythm_of(events: Events, origin: Index, rhythm: bool | Flags) -> Flags:
    """(N,) which events keep rhythm; by segment given, a hit does where the greater part of what lands in it does."""
    count = len(events.written_s)
    if isinstance(rhythm, bool | np.bool_):
        return np.full(count, bool(rhythm))
    mine = np.asarray(rhythm)[origin]
    landed = np.flatnonzero(events.arrival)
    share = np.bincount(events.event[landed], weights=np.where(mine[landed - 1], 1.0, -1.0), minlength=count)[: events.hits]
    return np.concatenate((share > 0.0, mine[np.flatnonzero(events.free)]))


def answer(programme: Programme, rig: Rig, abilities: Abilities, whole: bool = False, limit_s: float = np.inf) -> Answer | None:
    """The least-cost times that keep every row and every span, or None where pins leave none.

    Rows over more than two events that no times can keep are given up, as few as a high price on each finds.
    """
    events = programme.events
    rows, given_up, bound = programme.rows, 0, np.nan
    coils: set[tuple[int, int]] = set()
    air: set[tuple[int, int]] = set()
    shares = no_rows(events)
    free: Flags | None = None
    rounds, no_air = 0, False
    for _ in range(ROUNDS):
        least = least_cost(events, joined([rows, shares]), programme.terms, free, whole, limit_s)
        if least is None and len(shares.least):
            # Rows about earlier times may stand in one another's way. The latest alone are true to the times at hand; what
            # they ask beyond what can be is given at a price, so that the next round starts nearer.
            shares = picked(shares, np.arange((len(shares.least) + 1) // 2, len(shares.least)))
            least = least_cost(events, joined([rows, shares]), programme.terms, free, whole, limit_s, _price(programme))
        if least is None:
            kept = _keepable(programme, rows, whole, limit_s)
            dropped = len(rows.least) - len(kept.least)
            if not dropped:
                return None
            # Where no times keep the air even over whole moves, what is left of it is the checker's to tell.
            no_air |= np.count_nonzero(kept.kind == AIR_ROW) < np.count_nonzero(rows.kind == AIR_ROW)
            rows, given_up = kept, given_up + dropped
            continue
        free = least.free
        now = at_times(programme, least.shift_s)
        new = duty_spans(now, rig, abilities, coils)
        coils.update(new)
        if new:
            rows = joined([rows, duty_rows(new, programme.tracks, events, rig, abilities)])
            continue
        spans = [] if no_air else overdrawn(now, rig, abilities)
        if spans:
            more = whole_rows(spans, now, events, least.shift_s, rig, abilities, air)
            if len(more.least):
                rows = joined([rows, more])
                continue
        if not len(shares.least):
            bound = least.bound
        if not spans or rounds >= AIR_ROUNDS:
            break
        rounds += 1
        shares = joined([shares, share_rows(spans, now, events, least.shift_s, rig, abilities)])
    if least is None:
        return None
    if len(shares.least) and not spans:
        least, shares = _closer(programme, rig, abilities, rows, least, shares, limit_s)
    bound = least.bound if np.isnan(bound) else bound
    return Answer(replace(least, bound=bound), joined([rows, shares]), given_up)


def _closer(
    programme: Programme, rig: Rig, abilities: Abilities, rows: Rows, best: Least, shares: Rows, limit_s: float
) -> tuple[Least, Rows]:
    """A cheaper answer than one that keeps the air, and its rows about it, if there is one near: sequential programming.

    The rows about the way there are let go, and the spans that are tight are made linear about the answer itself; if the
    programme then finds nothing cheaper, no small change of times is.
    """
    events = programme.events
    for _ in range(CLOSER):
        now = at_times(programme, best.shift_s)
        about = share_rows(overdrawn(now, rig, abilities, NEAR), now, events, best.shift_s, rig, abilities)
        for _ in range(CLOSER_ROUNDS):
            found = least_cost(events, joined([rows, about]), programme.terms, best.free, False, limit_s)
            if found is None or found.cost >= best.cost * (1.0 - 1e-6):
                return best, shares
            now = at_times(programme, found.shift_s)
            spans = overdrawn(now, rig, abilities)
            if not spans and not duty_spans(now, rig, abilities, set()):
                best, shares = found, about
                break
            about = joined([about, share_rows(spans, now, events, found.shift_s, rig, abilities)])
        else:
            break
    return best, shares


def _keepable(programme: Programme, rows: Rows, whole: bool, limit_s: float) -> Rows:
    """The rows less those over more than two events that stay broken at a high price."""
    least = least_cost(programme.events, rows, programme.terms, None, whole, limit_s, _price(programme))
    if least is None:
        return rows
    broken = (rows.kind >= ABOVE_ROW) & (rows.least - rows.matrix @ least.shift_s > GIVEN_UP_S)
    return picked(rows, ~broken)


def _price(programme: Programme) -> float:
    """What a second of a row broken costs, in strokes: far more than what any row is worth in a programme that has times."""
    return 1e4 * max(1.0, float(programme.events.weight.max(initial=0.0)))


def at_times(programme: Programme, shift_s: Array) -> Tracks:
    """The prepared tracks with their events displaced, waits and all."""
    times = knot_times(programme.events, shift_s, programme.tracks)
    return replace(programme.tracks, time_s=times, duration_s=end_of(programme, shift_s, times))


def end_of(programme: Programme, shift_s: Array, times: Array) -> float:
    """The score's end: as written, or under rhythm as the last hit moved; never before the last knot."""
    event, offset = programme.end
    moved = shift_s[event] if event >= 0 else 0.0
    written = offset + (programme.events.written_s[event] if event >= 0 else 0.0)
    return float(max(written + moved, times.max(initial=0.0)))
