"""The whole programme of some tracks: events, rows that hold from the start, costs; and tracks with their times displaced."""

from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import least_durations
from composer.retime.events import Events, events_of, knot_times, with_waits
from composer.retime.hold import hold_rows
from composer.retime.memory import Memory, measured
from composer.retime.rows import Rows, duration_rows, joined, order_rows, pin_rows
from composer.retime.terms import Terms, all_terms
from composer.tracks import MOVE, STEP, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Stage:
    """The whole programme of some tracks.

    tracks: prepared by `with_waits`; origin (K',) where their knots come from; rhythm (N,) which events keep rhythm
    memory: what is known of its segments, for the next score; moves_L: air that moves draw, without their quivers
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
    memory: Memory = field(repr=False)
    moves_L: float


def stage_of(
    tracks: Tracks,
    abilities: Abilities,
    pins_s: Array,
    give_s: Array,
    firm: Array | None,
    rhythm: bool | Flags,
    memory: Memory | None = None,
) -> Stage:
    """The programme of tracks; pins in order of time, firm and rhythm as `retime` takes them; memory of another score's."""
    prepared, origin = with_waits(tracks)
    least, gone, litres, memory = measured(prepared, abilities, memory)
    least = _to_keep(prepared, least, np.arange(len(least)))
    events = events_of(prepared, abilities, least, None if firm is None else firm[origin], gone)
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
    return Stage(prepared, origin, least, events, rows, all_terms(events, keeps), keeps, end, memory, float(litres.sum()))


def durations_to_keep(tracks: Tracks, abilities: Abilities, segments: Index | None = None) -> Array:
    """Least durations as the programme keeps them: a jump takes no time, and what no time mends keeps what it has."""
    where = np.arange(len(tracks.time_s)) if segments is None else segments
    return _to_keep(tracks, least_durations(tracks, abilities, segments), where)


def _to_keep(tracks: Tracks, least: Array, where: Index) -> Array:
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


def at_times(stage: Stage, shift_s: Array) -> Tracks:
    """The prepared tracks with their events displaced, waits and all."""
    times = knot_times(stage.events, shift_s, stage.tracks)
    return replace(stage.tracks, time_s=times, duration_s=end_of(stage, shift_s, times))


def end_of(stage: Stage, shift_s: Array, times: Array) -> float:
    """The score's end: as written, or under rhythm as the last hit moved; never before the last knot."""
    event, offset = stage.end
    moved = shift_s[event] if event >= 0 else 0.0
    written = offset + (stage.events.written_s[event] if event >= 0 else 0.0)
    return float(max(written + moved, times.max(initial=0.0)))
