"""One search for the fewest moves over places that are tried, more being added where moves break off.

What has been weighed is kept: when places are added, only moves from or to them are weighed, and where only some stretches
of a series are searched, all else stays as it was.
"""

import numpy as np

from composer.score.tempo import TempoMap
from player.takes.fewest import Path, fewest
from player.takes.moves import Moves, Only, likely, moves_of
from player.takes.places import LEVELS, Places, places_of
from player.takes.played import Array, Index, Played

COARSE = 12.0
"""Slacks that a series may go between two places of the first search."""

CLOSE = 1.0
"""The same where moves break off, and no coarser places do."""

REPAIRS = 2
"""How often places are added before still closer ones are, and rates no longer count there, and targets lie closer together."""

ALL = 6
"""How often places are added at most."""


KEPT = -1
"""Shape of what stands for several moves that stay as they are."""


class Unfitted(Exception):
    """No moves lead through a series: a fault of this program, as straight lines between samples always do."""


def of_series(places: Places, series: int) -> Index:
    """The places of one series."""
    return places.place[places.first[series] : places.first[series + 1]]


class Search:
    """A search for the paths of some series, over the places `tried` for each, in UNITs.

    stages: for each series knots that are known to do: no moves between places that lie nearest to the same of them
    """

    def __init__(self, played: Played, tempo: TempoMap, tried: list[Index], watched: list[Array]):
        """watched: for each series the instants between which it is about straight"""
        self.played, self.tempo, self.watched = played, tempo, watched
        self.tried = list(tried)
        self.stages: list[Index] | None = None
        self._left = list(range(len(tried)))
        self._free: list[Index] = [np.empty(0, np.int64)] * len(tried)
        self._pins: list[tuple[Path, np.ndarray]] | None = None
        self._windows: list[tuple[Index, Index]] = []
        self._close: dict[tuple[int, float], Index] = {}
        self._known: tuple[Places, Moves] | None = None
        self._was_left = self._left

    def keep(self, pins: list[tuple[Path, np.ndarray]], windows: list[tuple[Index, Index]]) -> None:
        """Search within windows alone, from their first places to their last (UNITs), rising, for each series.

        pins: for each series the path that there is, and which of its knots, (K + 1,) bool, stay as they are
        """
        self._pins, self._windows = pins, windows

    def run(self) -> list[Path]:
        """The paths, each of the fewest moves over the places that were tried in the end. Raises Unfitted."""
        paths: list[Path | None] = [None] * len(self.tried)
        repair = 0
        while repair < ALL:
            places, moves = self._weighed(repair)
            found, breaks = fewest(places, moves)
            for k, path in zip(self._left, found, strict=True):
                paths[k] = path if path is None or self._pins is None else _with_kept(path, self._pins[k][0])
            if not len(breaks):
                return paths
            self._known = places, moves
            self._repair(places, breaks, repair)
            repair += 1
            if self._pins is not None and repair == REPAIRS:
                # What stays as it was leaves no way through: the whole of these series is searched.
                self._pins, self._known, repair = None, None, 0
        raise Unfitted(f"no moves lead through series {self._left}")

    def _weighed(self, repair: int) -> tuple[Places, Moves]:
        """Places as they are tried now, and the moves that fit between them."""
        left = self._left
        some = self.played.part(left)
        fine = 10.0 ** max(0, repair - 2 * REPAIRS + 1)
        places = places_of(some, self.tempo, COARSE, only=[self._searched(k) for k in left], fine=fine)
        places.free[:] = np.concatenate([np.isin(of_series(places, n), self._free[k]) for n, k in enumerate(left)])
        count = len(places.place)
        until = places.first[places.series + 1] - 1
        stage, fresh, kept = np.arange(count), np.ones(count, dtype=bool), []
        if self._pins is not None:
            until, pinned = self._pinned(places)
            kept.append(pinned)
        if self.stages is not None and not repair:
            stage = np.concatenate([_nearest(of_series(places, n), self.stages[k]) for n, k in enumerate(left)])
        if self._known is not None and fine == 1.0 and (self.stages is None or repair > 1):
            known, fresh = self._carried(places)
            kept.append(known)
        fits = moves_of(some, places, likely(some, places, Only(until, stage, fresh)), [self.watched[k] for k in left])
        return places, _together([*kept, fits])

    def _searched(self, series: int) -> Index:
        """The places tried for a series, without those in the midst of what stays as it is."""
        if self._pins is None:
            return self.tried[series]
        kept = self._kept(series)
        inner = self._pins[series][0].place[1:-1][kept[1:] & kept[:-1]]
        return np.setdiff1d(self.tried[series], inner, assume_unique=True)

    def _kept(self, series: int) -> np.ndarray:
        """Which moves of the path that there is stay as they are: those outside the windows, (K,)."""
        (path, stays), (low, high) = self._pins[series], self._windows[series]
        from_ = path.place[:-1]
        window = np.searchsorted(low, from_, side="right") - 1
        return stays[:-1] & stays[1:] & ~((window >= 0) & (from_ < high[window]))

    def _pinned(self, places: Places) -> tuple[Index, Moves]:
        """How far moves from each place may go, (N,); what stays between two windows, as one move. Knots that stay keep their
        targets."""
        until = np.arange(len(places.place))
        lots = []
        for n, k in enumerate(self._left):
            (path, stays), (low, high) = self._pins[k], self._windows[k]
            first, mine = places.first[n], of_series(places, n)
            begin, end = first + np.searchsorted(mine, low), first + np.searchsorted(mine, high)
            for a, b in zip(begin, end, strict=True):
                until[a:b] = b
            kept = np.concatenate([[False], self._kept(k), [False]])
            knots = np.flatnonzero(stays & ~(kept[1:] & kept[:-1]))
            pins = first + np.searchsorted(mine, path.place[knots])
            places.many[pins], places.grain[pins], places.lowest[pins] = (
                1,
                np.maximum(path.share[knots], 1e-9),
                path.share[knots] > 0.0,
            )
            runs = path.place[np.flatnonzero(kept[1:] != kept[:-1]).reshape(-1, 2)]
            source, target = first + np.searchsorted(mine, runs).T
            lots.append(Moves(source, target, np.full(len(runs), KEPT, dtype=np.int8), _first_to_first(len(runs))))
        return until, _together(lots)

    def _carried(self, places: Places) -> tuple[Moves, np.ndarray]:
        """Moves that were weighed before, and which places are new, or have become free, since."""
        was, moves = self._known
        far = int(places.place.max()) + 2
        old_of = {k: n for n, k in enumerate(self._was_left)}
        old_series = np.array([old_of[k] for k in self._left])
        key = old_series[places.series] * far + places.place
        old_key = was.series * far + was.place
        at = np.minimum(np.searchsorted(old_key, key), len(old_key) - 1)
        there = old_key[at] == key
        fresh = ~there | (places.free != was.free[at])
        index = np.full(len(old_key), -1)
        index[at[there & ~fresh]] = np.flatnonzero(there & ~fresh)
        source, target = index[moves.source], index[moves.target]
        stays = (source >= 0) & (target >= 0)
        return Moves(source[stays], target[stays], moves.shape[stays], moves.masks[stays]), fresh

    def _repair(self, places: Places, breaks: Index, repair: int) -> None:
        """Closer places where moves break off; what is whole is done with."""
        broken = places.series[breaks]
        for at, series in zip(breaks, broken, strict=True):
            k = self._left[series]
            first, last = places.first[series], places.first[series + 1] - 1
            low, high = places.place[max(first, at - 2)], places.place[min(last, at + 3)]
            mine = self._closer(k, COARSE if repair < REPAIRS else CLOSE)
            mine = mine[(mine > low) & (mine < high)]
            self.tried[k] = np.union1d(self.tried[k], mine)
            if repair >= REPAIRS:
                # Nothing that the rates allow keeps so close: what is left over is for the check to find.
                self._free[k] = np.union1d(self._free[k], np.concatenate([mine, places.place[max(first, at - 2) : at + 3]]))
        self._was_left, self._left = self._left, [self._left[series] for series in np.unique(broken)]

    def _closer(self, series: int, closeness: float) -> Index:
        if (series, closeness) not in self._close:
            self._close[series, closeness] = places_of(self.played.part([series]), self.tempo, closeness).place
        return self._close[series, closeness]


def _nearest(place: Index, knots: Index) -> Index:
    """The number of the knot that lies nearest to each place."""
    return np.searchsorted((knots[1:] + knots[:-1]) / 2, place)


def _together(lots: list[Moves]) -> Moves:
    return Moves(*(np.concatenate([getattr(lot, name) for lot in lots]) for name in ("source", "target", "shape", "masks")))


def _with_kept(path: Path, kept: Path) -> Path:
    """A path in which what stands for moves that stay as they are is those moves again."""
    move = 0
    lots: list[tuple[np.ndarray, ...]] = []
    for run in np.flatnonzero(path.shape == KEPT):
        first, last = np.searchsorted(kept.place, path.place[run : run + 2])
        lots.append((*_knots(path, move, run), path.shape[move:run]))
        lots.append((*_knots(kept, first, last), kept.shape[first:last]))
        move = run + 1
    lots.append((*_knots(path, move, path.moves + 1), path.shape[move:]))
    return Path(*(np.concatenate(part) for part in zip(*lots, strict=True)))


def _knots(path: Path, begin: int, end: int) -> tuple[np.ndarray, ...]:
    return path.place[begin:end], path.time_s[begin:end], path.share[begin:end]


def _first_to_first(count: int) -> np.ndarray:
    masks = np.zeros((count, LEVELS), dtype=np.uint8)
    masks[:, 0] = 1
    return masks
