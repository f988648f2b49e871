"""Where knots may lie: places in counts that read well, as close together as what was played asks for."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import maximum_filter1d

from composer.score.tempo import TempoMap
from player.takes.played import Array, Index, Played

UNIT = 16_000_000
"""Parts of a count in which places are kept, so that sixteenths and millionths are both whole."""

AROUND_S = 0.2
"""How far from a place its surroundings reach: in a fast passage the places just before and after are close together too."""

FINEST_S = 0.004
"""No two places closer than this are needed: a tick is longer."""

FURTHEST_S = 1.0

CORNER = 0.5
"""A share of the slack: straight lines between neighbouring places stay so close to what was played."""

ROOM = 0.97
"""Of the slack: what lies between the instants looked at may be worse than they are by the rest."""

LEVELS = 5
"""Targets that are weighed at each place, at most."""


def _ladder() -> Index:
    binary = [Fraction(2) ** k for k in range(6, -5, -1)]
    decimal = [Fraction(m, 10**n) for n in range(2, 7) for m in (5, 2, 1)]
    return np.array([int(step * UNIT) for step in [*binary, *decimal] if step >= Fraction(1, 16) or step < Fraction(1, 20)])


STEPS = _ladder()
"""Distances of places, each finer: 64 counts to a sixteenth by halves, then 0.02, 0.01, 0.005 and so on."""


@dataclass(frozen=True, slots=True, eq=False)
class Places:
    """N places of all series, one series after another, rising within each.

    first: (S + 1,); series, place, time_s, share, slack: (N,) `place` in UNITs of a count
    grain: (N,) distance of the targets that are weighed; lowest: (N,) the lowest of them over its grain; many: (N,) how many
    free: (N,) where moves begin whose rates do not count
    """

    first: Index
    series: Index
    place: Index
    time_s: Array
    share: Array
    slack: Array
    grain: Array
    lowest: Index
    many: Index
    free: NDArray[np.bool_]

    def targets_of(self, some: Index) -> Array:
        """The targets that are weighed at some places, (LEVELS, E), nan where there are no more."""
        step = np.arange(LEVELS)[:, None]
        levels = (self.lowest[some] + step) * self.grain[some]
        begins = self.first[self.series[some]] == some
        levels[0, begins] = self.share[some[begins]]
        levels[step >= self.many[some]] = np.nan
        return levels


def places_of(played: Played, tempo: TempoMap, closeness: float, only: list[Index] | None = None, fine: float = 1.0) -> Places:
    """The places for knots of all series.

    closeness: how many slacks a series may go between two places; only: for each series, the places to weigh instead
    fine: makes the targets' grain that many times finer
    """
    cuts = _range(played, tempo)
    lots = []
    for series in range(len(played.share)):
        if only is None:
            lots.append(_of_series(played, tempo, series, closeness, cuts))
        else:
            inside = only[series][(only[series] > cuts[0]) & (only[series] < cuts[1])]
            lots.append(np.union1d(inside, cuts))
    first = np.concatenate([[0], np.cumsum([len(lot) for lot in lots])])
    series = np.repeat(np.arange(len(lots)), np.diff(first))
    place = np.concatenate(lots)
    time = tempo.seconds(place / UNIT)
    share = played.at(played.share, series, time)
    slack = played.at(played.slack, series, time)
    grain = round_number(0.5 * slack / fine)
    tiny = 1e-9
    low = np.ceil(np.maximum(share - ROOM * slack, 0.0) / grain - tiny)
    high = np.floor(np.minimum(share + ROOM * slack, 1.0) / grain + tiny)
    # Of too many targets those in the middle.
    low = np.where(high - low >= LEVELS, np.clip(np.rint(share / grain) - LEVELS // 2, low, high - LEVELS + 1), low)
    many = np.clip(high - low + 1, 0, LEVELS)
    share[first[:-1]] = played.start
    many[first[:-1]] = 1
    return Places(
        first, series, place, time, share, slack, grain, low.astype(np.int64), many.astype(np.int64), np.zeros(len(place), bool)
    )


def round_number(value: Array) -> Array:
    """The greatest of 1, 2, 5, 10 and so on, and of their tenths, that is at most each value."""
    power = 10.0 ** np.floor(np.log10(value) + 1e-9)
    lead = value / power
    return power * np.select([lead >= 5.0 - 1e-9, lead >= 2.0 - 1e-9], [5.0, 2.0], 1.0)


SIXTEENTH = UNIT // 16


def nearby(place: Index, around: int, step: int) -> Index:
    """Places within `around` UNITs of others, on a grid of `step`, and the sixteenths of counts among them."""
    found = []
    for grain in {step, max(step, SIXTEENTH)}:
        grid = (place[:, None] // grain + np.arange(-(around // grain) - 1, around // grain + 2)) * grain
        near = np.abs(grid - place[:, None]) <= max(around, grain)
        found.append(grid[near & (grid > 0)])
    return np.unique(np.concatenate(found))


def _range(played: Played, tempo: TempoMap) -> tuple[int, int]:
    """The first place and the last: where the take begins, and the first round place at or after its end."""
    begin, end = tempo.counts([played.begin_s, played.end_s])
    whole = SIXTEENTH
    low = round(float(begin) * UNIT)
    high = int(np.ceil(float(end) * UNIT / whole - 1e-6)) * whole
    return low, max(high, low + 1)


def _of_series(played: Played, tempo: TempoMap, series: int, closeness: float, cuts: tuple[int, int]) -> Index:
    share, slack = played.share[series], played.slack[series]
    if len(share) < 2:
        return np.array(cuts)
    speed = np.abs(np.gradient(share, played.step_s))
    width = max(3, int(2.0 * AROUND_S / played.step_s) | 1)
    apart_s = np.minimum(closeness * slack / np.maximum(maximum_filter1d(speed, width), 1e-12), FURTHEST_S)
    low, high = cuts
    # Seconds a UNIT lasts, at the slowest and at the fastest of the take.
    at = tempo.seconds(np.linspace(low, high, 65) / UNIT)
    unit_s = np.diff(at) / ((high - low) / 64)
    found, coarser = [np.array([low, high])], None
    for step in STEPS:
        if step * unit_s.min() > FURTHEST_S and coarser is None:
            continue
        grid = np.arange(low // step + 1, -(-high // step)) * step
        if coarser is not None and len(grid):
            time = tempo.seconds(grid / UNIT)
            local = np.interp(grid, np.linspace(low, high, 65)[:-1], unit_s)
            grid = grid[_near(played, apart_s, time) < coarser * local]
        found.append(grid)
        coarser = step
        if step * unit_s.max() <= max(FINEST_S, apart_s.min()):
            break
    return _at_corners(played, tempo, series, np.unique(np.concatenate(found)), float(unit_s.mean()))


def _near(played: Played, values: Array, time_s: Array) -> Array:
    place = np.rint((time_s - played.begin_s) / played.step_s).astype(np.int64)
    return values[np.clip(place, 0, len(values) - 1)]


def _at_corners(played: Played, tempo: TempoMap, series: int, place: Index, unit_s: float) -> Index:
    """Places added until straight lines between neighbours stay close to what was played, or they are as fine as is needed."""
    share, slack = played.share[series], played.slack[series]
    grid_s = played.begin_s + played.step_s * np.arange(len(share))
    for _ in range(12):
        time = tempo.seconds(place / UNIT)
        off = np.abs(np.interp(grid_s, time, np.interp(time, grid_s, share)) - share) > CORNER * slack
        gap = np.unique(np.searchsorted(time, grid_s[off], side="right") - 1)
        gap = gap[(gap >= 0) & (gap < len(place) - 1)]
        gap = gap[(place[gap + 1] - place[gap]) * unit_s > FINEST_S]
        if not len(gap):
            break
        extra = []
        for left, right in zip(place[gap], place[gap + 1], strict=True):
            step = int(STEPS[np.searchsorted(-STEPS, -((right - left) // 2))]) if right - left > 2 * STEPS[-1] else 1
            extra.append(np.arange(left // step + 1, -(-right // step)) * step)
        more = np.unique(np.concatenate([place, *extra]))
        if len(more) == len(place):
            break
        place = more
    return place
