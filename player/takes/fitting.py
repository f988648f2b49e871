"""Fitting: for each series that was played, the fewest moves in the shapes of the language that stay within its slack.

A search over all places at once would weigh some hundred million moves. So it is done from the coarse to the fine: where moves
would about fit between places some way apart, the fewest of them tell what kind of move stands where; then places close about
their ends are weighed in full, with the targets at each, and again closer. Each search is exact over the places it is given
(tests hold the whole against an exhaustive one).
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from composer.score.tempo import TempoMap
from player.takes.fewest import Path, fewest
from player.takes.moves import roughly
from player.takes.places import STEPS, UNIT, Places, nearby, places_of
from player.takes.played import Array, Index, Played
from player.takes.searching import COARSE, Search, of_series

ROUNDS_S = ((0.26, 0.06), (0.04, 0.015))
"""How far about the knots found so far each further search weighs places, and how close together, in s."""

LOTS = 8
"""Few series are fitted in so many lots, so that no core waits for another that has most of them."""

GUESSED = 18.0
"""Slacks that a series may go between two places of the guess at what kind of move stands where."""

NOTED = 0.1
"""Of the slack: so far off a straight line between two instants an instant is watched too."""

BATCH = 1 << 19
"""Values of series that are fitted together: few enough to stay near the processor, and for all cores to have some."""

BESIDE = 2
"""Moves before and after one that is to be fitted again that are searched with it."""


Each = Callable[[Callable[[Any], Any], Sequence[Any], Callable[[int], None]], list[Any]]
"""What `one_by_one` is: something done with each of some items, in their order; told meanwhile is how many are done."""


def one_by_one(do: Callable[[Any], Any], items: Sequence[Any], tell: Callable[[int], None]) -> list[Any]:
    """Everything in this process, on one core."""
    results = []
    for item in items:
        results.append(do(item))
        tell(len(results))
    return results


@dataclass(frozen=True, slots=True, eq=False)
class _Lot:
    """Some series to be fitted, without anything of the others.

    coarse, watched: for each series places some way apart, and the instants between which it is about straight
    paths, where_s: where they are fitted again, the paths that there are, and for each the instants
    """

    played: Played
    tempo: TempoMap
    coarse: list[Index]
    watched: list[Array]
    paths: list[Path]
    where_s: list[Array]


class Fitting:
    """The series of a take, fitted once and then again where that is wanted."""

    def __init__(self, played: Played, tempo: TempoMap, each: Each = one_by_one):
        """each: does something with each of some lots of series, which know nothing of each other"""
        self._played, self._tempo, self._each = played, tempo, each
        self._coarse: list[Index] = []
        self._watched: list[Array] = []

    def fit(self, tell: Callable[[float], None] = lambda share: None) -> list[Path]:
        """The fewest moves for each of the series. The curve ends at the first sixteenth count after the last instant.

        tell: is told which share of it is done
        """
        lots = [_Lot(self._played.part(some), self._tempo, [], [], [], []) for some in self._lots(len(self._played.share))]
        found: list[Path] = []
        for paths, coarse, watched in self._each(_fit, lots, lambda done: tell(done / len(lots))):
            found += paths
            self._coarse += coarse
            self._watched += watched
        return found

    def again(self, played: Played, series: list[int], paths: list[Path], where_s: list[Array]) -> list[Path]:
        """Paths of some series once more, after slack or rates have changed about some instants: only what lies there is
        searched, between knots that stay as they are.

        played: all series, as they are to be fitted now; where_s: for each of `series` the instants
        """
        lots = []
        for some in self._lots(len(series)):
            mine = [series[n] for n in some]
            coarse, watched = [self._coarse[k] for k in mine], [self._watched[k] for k in mine]
            lots.append(
                _Lot(played.part(mine), self._tempo, coarse, watched, [paths[n] for n in some], [where_s[n] for n in some])
            )
        return [path for lot in self._each(_again, lots, lambda done: None) for path in lot]

    def _lots(self, count: int) -> list[range]:
        rows = max(1, min(BATCH // max(1, self._played.share.shape[1]), -(-count // LOTS)))
        return [range(begin, min(begin + rows, count)) for begin in range(0, count, rows)]


def _fit(lot: _Lot) -> tuple[list[Path], list[Index], list[Array]]:
    """The paths of a lot, and its `coarse` and `watched`."""
    played, tempo, coarse = lot.played, lot.tempo, places_of(lot.played, lot.tempo, GUESSED)
    mine = [of_series(coarse, series) for series in range(len(played.share))]
    watched = [_with_furthest(played, k, coarse.time_s[coarse.first[k] : coarse.first[k + 1]]) for k in range(len(mine))]
    guesses, _ = fewest(coarse, roughly(played, coarse))
    knots = [mine[series] if guess is None else guess.place for series, guess in enumerate(guesses)]
    best: list[Path | None] = [None] * len(knots)
    for number, (around_s, apart_s) in enumerate(ROUNDS_S):
        step, around = _grid(tempo, coarse, around_s, apart_s)
        tried = [np.union1d(nearby(places, around, step), places) for places in knots]
        search = Search(played, tempo, tried, _and_watch(watched, played))
        if number:
            search.stages = knots
        for series, path in enumerate(search.run()):
            if best[series] is None or path.moves <= best[series].moves:
                best[series], knots[series] = path, path.place
    return best, mine, watched


def _again(lot: _Lot) -> list[Path]:
    """The paths of a lot once more."""
    some, tempo = lot.played, lot.tempo
    step, around = _grid(tempo, places_of(some.part([0]), tempo, COARSE, [np.empty(0, np.int64)]), *ROUNDS_S[0])
    tried, pins, windows = [], [], []
    for mine, path, times in zip(lot.coarse, lot.paths, lot.where_s, strict=True):
        move = np.clip(np.searchsorted(path.time_s, times, side="right") - 1, 0, path.moves - 1)
        open_ = np.zeros(path.moves, dtype=bool)
        open_[np.clip(move[:, None] + np.arange(-BESIDE, BESIDE + 1), 0, path.moves - 1)] = True
        bounds = np.flatnonzero(np.diff(open_, prepend=False, append=False)).reshape(-1, 2)
        inner = np.zeros(path.moves + 1, dtype=bool)
        inner[1:-1] = open_[1:] & open_[:-1]
        inner[-1] = open_[-1]
        low, high = path.place[bounds].T
        inside = [mine[a:b] for a, b in zip(np.searchsorted(mine, low), np.searchsorted(mine, high), strict=True)]
        around_knots = nearby(path.place[inner], around, step)
        at = np.searchsorted(low, around_knots, side="right") - 1
        around_knots = around_knots[(at >= 0) & (around_knots < high[at])]
        tried.append(np.unique(np.concatenate([path.place, around_knots, *inside])))
        pins.append((path, ~inner))
        windows.append((low, high))
    search = Search(some, tempo, tried, _and_watch(lot.watched, some))
    search.keep(pins, windows)
    return search.run()


def _with_furthest(played: Played, series: int, time_s: Array) -> Array:
    """Instants, and between each two those at which what was played lies furthest above and below a straight line."""
    share = played.share[series]
    grid_s = played.begin_s + played.step_s * np.arange(len(share))
    off = share - np.interp(grid_s, time_s, np.interp(time_s, grid_s, share))
    inside = np.searchsorted(grid_s, time_s[:-1])
    inside = np.unique(inside[inside < len(share)])
    lasts = np.diff(inside, append=len(share))
    furthest = []
    for side in (off, -off):
        most = np.maximum.reduceat(side, inside)
        at = np.flatnonzero(side == np.repeat(most, lasts))
        at = at[np.unique(np.repeat(np.arange(len(inside)), lasts)[at], return_index=True)[1]]
        furthest.append(grid_s[at[most > NOTED * played.slack[series, at]]])
    return np.union1d(time_s, np.concatenate(furthest))


def _and_watch(watched: list[Array], played: Played) -> list[Array]:
    return [np.union1d(times, watch) for times, watch in zip(watched, played.watch, strict=True)]


def _grid(tempo: TempoMap, places: Places, around_s: float, apart_s: float) -> tuple[int, int]:
    """How far apart places are, and how far about a knot, in UNITs at the pace of the take's start."""
    begin = int(places.place[0])
    unit_s = float(tempo.seconds((begin + UNIT) / UNIT) - tempo.seconds(begin / UNIT)) / UNIT
    step = int(STEPS[np.argmin(np.abs(np.log(STEPS * unit_s / apart_s)))])
    return step, max(step, int(around_s / unit_s))
