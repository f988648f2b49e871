"""How long it is until a cue, as an operator counts: bars far off, counts near by. In closed form from the tempo map."""

import math
from dataclasses import dataclass

from composer.score.tempo import TempoMap
from composer.warp import UNWARPED, Warp

COUNTED_BARS = 2.0
"""From so many bars before it on, counts are told and not bars."""

ROUNDING = 1e-6
"""Counts by which a place may be beyond a count and still be on it: positions are seconds as floats."""


@dataclass(frozen=True, slots=True)
class CountIn:
    """The way from a position to a cue.

    seconds: until then, 0 at or beyond it; counts, bars: the same by the score, nan where it has none
    figure, unit: what is shown large: whole "counts", "bars" or "seconds" that are left, the last of each as 1
    beat, of: the count of the bar that is under way, from 1, and how many that bar has; 0 where there is no tempo map
    """

    seconds: float
    counts: float
    bars: float
    figure: int
    unit: str
    beat: int
    of: int


def count_in(position_s: float, cue_s: float, tempo: TempoMap | None, warp: Warp = UNWARPED) -> CountIn:
    """The way from `position_s` to a cue at `cue_s`, both instants as played; `warp` says where they were written."""
    seconds = max(0.0, cue_s - position_s)
    if tempo is None:
        return CountIn(seconds, math.nan, math.nan, _whole(seconds), "seconds", 0, 0)
    here, there = (float(tempo.counts(warp.was(at))) for at in (position_s, cue_s))
    counts = max(0.0, there - here)
    bars = max(0.0, float(tempo.bars(there)) - float(tempo.bars(here)))
    beat, of = beat_of(here, tempo)
    if bars > COUNTED_BARS + ROUNDING:
        return CountIn(seconds, counts, bars, _whole(bars), "bars", beat, of)
    return CountIn(seconds, counts, bars, _whole(counts), "counts", beat, of)


def beat_of(counts: float, tempo: TempoMap) -> tuple[int, int]:
    """The count of its bar in which a place lies, from 1, and how many counts that bar has."""
    bar = math.floor(float(tempo.bars(max(counts, 0.0))) + ROUNDING)
    begin, end = (float(tempo.counts_of_bars(at)) for at in (bar, bar + 1))
    return max(1, math.floor(counts - begin + ROUNDING) + 1), max(1, round(end - begin))


def _whole(left: float) -> int:
    return max(0, math.ceil(left - ROUNDING))
