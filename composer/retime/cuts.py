"""Cutting planes (Kelley 1960): rows for what is asked too much of a coil, added when the times at hand break them."""

from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.buckets import level
from composer.limits.coil import Coils, coils_of, on_times
from composer.limits.duty import OnTime, on_time
from composer.retime.events import Events
from composer.retime.rows import DUTY_ROW, Rows, Sums, joined, no_rows, sum_rows
from composer.retime.stage import Stage
from composer.retime.switches import may_follow_too_soon, switch_rows, too_soon
from composer.rig.model import Rig
from composer.tracks import Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]

Span = tuple[int, int]
"""First and last segment of a span of one fiber."""

AT_ONCE = 40
"""How many spans of one coil are added in one round, the deepest first."""

EXACT = 1e-9
"""Relative: what overdraws a store by less is the solver's rounding."""


@dataclass(slots=True)
class Coiled:
    """Rows over coils that a search has asked for so far: spans of on-time, and starts that must stay apart."""

    spans: set[Span] = field(default_factory=set)
    starts: set[Span] = field(default_factory=set)

    def more(self, now: Tracks, stage: Stage, rig: Rig, abilities: Abilities) -> tuple[Rows, list[Span]]:
        """Rows that the times at hand break, and the first and last segment that each speaks of, those of starts last."""
        spans = duty_spans(now, rig, abilities, self.spans)
        quick = may_follow_too_soon(stage.tracks, stage.least_s, rig)
        starts = too_soon(now, rig, abilities, self.starts) if quick else []
        if not spans and not starts:
            return no_rows(stage.events), []
        self.spans.update(spans)
        self.starts.update(starts)
        apart = switch_rows(starts, stage.tracks, stage.events, rig)
        return joined([duty_rows(spans, stage.tracks, stage.events, rig, abilities), apart]), spans + starts


def duty_spans(now: Tracks, rig: Rig, abilities: Abilities, known: set[Span]) -> list[Span]:
    """Spans of tracks with the times at hand that ask too much of a coil and are not yet known, deepest first by coil."""
    coils = coils_of(rig)
    if (coils.duty >= 1.0).all():
        return []
    on = on_time(now, rig, abilities)
    found: list[Span] = []
    for f in _overdrawn(on, coils).tolist():
        mine = slice(on.first[f], on.first[f + 1])
        seconds, segment = on.on_s[mine], on.segment[mine]
        here = level(on.time_s[mine], seconds, coils.duty[f])
        # The hold at the end of a track lasts as long as the score: no times change that.
        ends = (segment >= 0) & (segment != now.first[f + 1] - 1)
        over = np.flatnonzero((here.missing > coils.burst_s[f] * (1.0 + EXACT)) & ends)
        end = over[np.argsort(-here.missing[over], kind="stable")][:AT_ONCE]
        # A span begins with the first energised segment after the coil had last recovered.
        energised = np.flatnonzero(segment >= 0)
        begin = energised[np.searchsorted(energised, here.since[end] + 1)]
        spans = zip(segment[begin].tolist(), segment[end].tolist(), strict=True)
        found += [span for span in spans if span not in known]
    return found


def _overdrawn(on: OnTime, coils: Coils) -> Index:
    """The fibers whose coils some span asks too much of."""
    fiber = np.repeat(np.arange(len(coils.duty)), np.diff(on.first))
    short = on.on_s - coils.duty[fiber] * on.time_s
    # Each fiber lies so far below the one before it that its own lowest is the lowest so far.
    apart = 2.0 * float(np.abs(short).max(initial=0.0)) + 1.0
    missing = short - (np.minimum.accumulate(short - apart * fiber) + apart * fiber)
    return np.unique(fiber[missing > coils.burst_s[fiber] * (1.0 + EXACT) - 1e-12 * apart * len(coils.duty)])


def duty_rows(spans: list[Span], tracks: Tracks, events: Events, rig: Rig, abilities: Abilities) -> Rows:
    """For each span of prepared tracks: its on-time less `duty` times its length at most `duty_burst_s`."""
    if not spans:
        return no_rows(events)
    coils = coils_of(rig)
    energised = _energised(tracks, rig, abilities)
    fiber = np.searchsorted(tracks.first, [first for first, _ in spans], side="right") - 1
    lengths = np.array([last - first + 1 for first, last in spans])
    segment = np.concatenate([np.arange(first, last + 1) for first, last in spans])
    row = np.repeat(np.arange(len(spans)), lengths)
    share = energised[segment] - coils.duty[fiber][row]
    sums = Sums(row, segment, share, coils.burst_s[fiber])
    return sum_rows(tracks, events, sums, DUTY_ROW, np.array([last for _, last in spans]))


def _energised(tracks: Tracks, rig: Rig, abilities: Abilities) -> Array:
    """(K,) 1 for each segment of prepared tracks that energises its coil, be it without length yet, 0 for the others."""
    stretched = lengthened(tracks)
    on = np.zeros(len(tracks.time_s))
    on[on_times(stretched, rig, abilities).segment] = 1.0
    return on


def lengthened(tracks: Tracks) -> Tracks:
    """The tracks with a second added to every segment: a hold of no length can be told from one that energises nothing."""
    place = np.arange(len(tracks.time_s)) - np.repeat(tracks.first[:-1], np.diff(tracks.first))
    times = tracks.time_s + place
    return replace(tracks, time_s=times, duration_s=float(max(tracks.duration_s, times.max(initial=0.0)) + 1.0))
