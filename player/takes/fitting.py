"""Fitting: for each series that was played, the fewest moves in the shapes of the language that stay within its slack.

A search over all places at once would weigh some hundred million moves. So it is done from the coarse to the fine: where moves
would about fit between places some way apart, the fewest of them tell what kind of move stands where; then places close about
their ends are weighed in full, with the targets at each, and again closer. Each search is exact over the places it is given
(tests hold the whole against an exhaustive one). Where no moves lead on, closer places are added until they do.
"""

import numpy as np

from composer.score.tempo import TempoMap
from player.takes.fewest import Path, fewest
from player.takes.moves import likely, moves_of, roughly
from player.takes.places import STEPS, UNIT, Places, nearby, places_of
from player.takes.played import Array, Index, Played

COARSE = 12.0
"""Slacks that a series may go between two places of the first search."""

CLOSE = 1.0
"""The same where moves break off, and no coarser places do."""

ROUNDS_S = ((0.12, 0.03), (0.03, 0.015), (0.015, 0.006))
"""How far about the knots found so far each further search weighs places, and how close together, in s."""

REPAIRS = 2
"""How often places are added before still closer ones are, and rates no longer count there, and targets lie closer together."""

BATCH = 1 << 21
"""Values of series that are fitted together."""


class Unfitted(Exception):
    """No moves lead through a series: a fault of this program, as straight lines between samples always do."""


def fit(played: Played, tempo: TempoMap) -> list[Path]:
    """The fewest moves for each of the series. The curve ends at the first sixteenth count after the last instant."""
    rows = max(1, BATCH // max(1, played.share.shape[1]))
    found: list[Path] = []
    for begin in range(0, len(played.share), rows):
        found += _fit(played.part(range(begin, min(begin + rows, len(played.share)))), tempo)
    return found


def _fit(played: Played, tempo: TempoMap) -> list[Path]:
    coarse = places_of(played, tempo, COARSE)
    guesses, _ = fewest(coarse, roughly(played, coarse, likely(played, coarse)))
    knots = [
        _of_series(coarse, series) if guess is None else guess.place for series, guess in enumerate(guesses)
    ]  # fmt: skip
    watched = _watched(played, coarse)
    best: list[Path | None] = [None] * len(knots)
    for around_s, apart_s in ROUNDS_S:
        step, around = _grid(tempo, coarse, around_s, apart_s)
        tried = [np.union1d(nearby(places, around, step), places) for places in knots]
        for series, path in enumerate(_joined(played, tempo, tried, watched)):
            if best[series] is None or path.moves <= best[series].moves:
                best[series], knots[series] = path, path.place
    return best


def mended(played: Played, tempo: TempoMap, paths: list[Path], where_s: list[Array]) -> list[Path]:
    """Paths once more, after slack or rates have changed about some instants: only what lies there is searched again.

    where_s: for each series the instants
    """
    coarse = places_of(played, tempo, COARSE)
    watched = _watched(played, coarse)
    step, around = _grid(tempo, coarse, *ROUNDS_S[0])
    tried = []
    for series, (path, times) in enumerate(zip(paths, where_s, strict=True)):
        move = np.clip(np.searchsorted(path.time_s, times, side="right") - 1, 0, path.moves - 1)
        ends = np.unique(np.clip(move[:, None] + np.arange(-1, 3), 0, path.moves))
        low, high = path.place[np.maximum(move - 1, 0)], path.place[np.minimum(move + 2, path.moves)]
        mine = _of_series(coarse, series)
        inside = np.searchsorted(mine, low), np.searchsorted(mine, high)
        some = [mine[a:b] for a, b in zip(*inside, strict=True)]
        tried.append(np.unique(np.concatenate([path.place, nearby(path.place[ends], around, step), *some])))
    return _joined(played, tempo, tried, watched)


def _watched(played: Played, coarse: Places) -> list[Array]:
    return [
        np.union1d(coarse.time_s[coarse.first[k] : coarse.first[k + 1]], watch) for k, watch in enumerate(played.watch)
    ]  # fmt: skip


def _grid(tempo: TempoMap, places: Places, around_s: float, apart_s: float) -> tuple[int, int]:
    """How far apart places are, and how far about a knot, in UNITs at the pace of the take's start."""
    begin = int(places.place[0])
    unit_s = float(tempo.seconds((begin + UNIT) / UNIT) - tempo.seconds(begin / UNIT)) / UNIT
    step = int(STEPS[np.argmin(np.abs(np.log(STEPS * unit_s / apart_s)))])
    return step, max(step, int(around_s / unit_s))


def _of_series(places: Places, series: int) -> Index:
    return places.place[places.first[series] : places.first[series + 1]]


def _joined(played: Played, tempo: TempoMap, tried: list[Index], watched: list[Array]) -> list[Path]:
    """The fewest moves over places that are tried, more being added where they break off."""
    paths: list[Path | None] = [None] * len(tried)
    left = list(range(len(tried)))
    free: list[Index] = [np.empty(0, np.int64)] * len(tried)
    close: Places | None = None
    for repair in range(3 * REPAIRS):
        some = played.part(left)
        fine = 10.0 ** max(0, repair - 2 * REPAIRS + 1)
        places = places_of(some, tempo, COARSE, only=[tried[k] for k in left], fine=fine)
        places.free[:] = np.concatenate([np.isin(_of_series(places, n), free[k]) for n, k in enumerate(left)])
        found, breaks = fewest(places, moves_of(some, places, likely(some, places), [watched[k] for k in left]))
        for k, path in zip(left, found, strict=True):
            paths[k] = path
        if not len(breaks):
            return paths
        broken = places.series[breaks]
        if close is None or repair == REPAIRS:
            close = places_of(played, tempo, COARSE if repair < REPAIRS else CLOSE)
        for at, series in zip(breaks, broken, strict=True):
            k = left[series]
            first, last = places.first[series], places.first[series + 1] - 1
            low, high = places.place[max(first, at - 2)], places.place[min(last, at + 3)]
            mine = _of_series(close, k)
            mine = mine[(mine > low) & (mine < high)]
            tried[k] = np.union1d(tried[k], mine)
            if repair >= REPAIRS:
                # Nothing that the rates allow keeps so close: what is left over is for the check to find.
                free[k] = np.union1d(free[k], np.concatenate([mine, places.place[max(first, at - 2) : at + 3]]))
        left = [left[series] for series in np.unique(broken)]
    raise Unfitted(f"no moves lead through series {left}")
