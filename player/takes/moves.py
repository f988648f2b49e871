"""Which single moves stay within the slack of what was played, from which target at which place to which at which."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.shapes import NAMES
from player.takes.fits import fitting, progress_at
from player.takes.places import LEVELS, ROOM, Places
from player.takes.played import Array, Index, Played
from player.takes.sudden import GLANCED, SUDDEN, Sudden, suddens
from player.takes.watch import MIDDLES, Watch

SHAPES = ("linear", "smooth", "swell", "settle")
"""Shapes that are weighed everywhere; a linear move between equal targets is a hold."""

FURTHEST = 400
"""Places that one move may span."""

EARLY = np.array([0.2, 0.4, 0.6, 0.8])
"""Shares of a move's time at which most moves that do not fit are found out at a glance."""

ROUGH = 1.3
"""Slacks by which a move may be off that only about fits: a better place or target nearby may mend so much."""

FLAT = 2.0
"""Slacks: over so short a way every shape is as good as a straight line."""

FAST = 0.7
"""Of the fastest rate: what goes slower than this as it arrives is no sudden move."""


@dataclass(frozen=True, slots=True, eq=False)
class Moves:
    """E moves between places: from, to, shape as in `shapes.NAMES`, and for each target of `from` the targets of `to` that it
    may go to, as bits: (E, LEVELS) uint8."""

    source: Index
    target: Index
    shape: NDArray[np.int8]
    masks: NDArray[np.uint8]


Likely = tuple[Index, Index, NDArray[np.int8]]
"""Pairs of places, and shapes, of moves that are to be looked at."""


def moves_of(played: Played, places: Places, pairs: Likely, watched: list[Array]) -> Moves:
    """Those of some moves that fit, with the targets between which they do.

    watched: for each series the instants between which it is about straight, rising
    """
    sources, targets, shapes = pairs
    watch = Watch(played, places, watched)
    lots, rungs = [], played.rungs()
    for shape in SHAPES:
        mine = shapes == NAMES.index(shape)
        lots.append(fitting(played, places, sources[mine], targets[mine], shape, watch, rungs))
    mine = shapes == SUDDEN
    lots.append(suddens(played, places, sources[mine], targets[mine], watch))
    return Moves(*(np.concatenate([lot[part] for lot in lots]) for part in range(4)))


def roughly(played: Played, places: Places) -> Moves:
    """The moves that would about fit if they went from what was played to what was played; targets do not count."""
    sources, targets, shapes = _glanced(played, places, None, MIDDLES, ROUGH)
    good = np.ones(len(sources), dtype=bool)
    for series in np.unique(places.series[sources[shapes == SUDDEN]]):
        mine = np.flatnonzero((shapes == SUDDEN) & (places.series[sources] == series))
        for up in (True, False):
            part = mine[(places.share[targets[mine]] > places.share[sources[mine]]) == up]
            if len(part):
                clock = played.clocks[series]
                way = Sudden(played, places, clock, sources[part], targets[part], up, going=GLANCED)
                good[part] = np.all(np.abs(way.curve() - way.met) <= ROUGH / ROOM * way.slack, axis=1)
    masks = np.zeros((int(good.sum()), LEVELS), dtype=np.uint8)
    masks[:, 0] = 1
    return Moves(sources[good], targets[good], shapes[good], masks)


@dataclass(frozen=True, slots=True, eq=False)
class Only:
    """Which moves are looked at, (N,) each: none from a place beyond `until`, none within a `stage`, some end `fresh`."""

    until: Index
    stage: Index
    fresh: NDArray[np.bool_]


def likely(played: Played, places: Places, only: Only | None = None) -> Likely:
    """The moves that pass a glance. All that fit are among them, but for bent ones that hardly differ from straight ones."""
    return _glanced(played, places, only, EARLY, 2.0)


def _glanced(played: Played, places: Places, only: Only | None, at: Array, slacks: float) -> Likely:
    """The moves that are off by no more than so many slacks at shares `at` of their time, from what was played to it."""
    count = len(places.place)
    share, slack = places.share, places.slack
    alive = np.arange(count)
    low, high = share.copy(), share.copy()
    fall, rise = np.zeros(count), np.zeros(count)
    ends = places.first[places.series + 1] if only is None else only.until + 1
    sudden = _arrives_fast(played, places)
    found: list[tuple[Index, Index, int]] = []
    gone = {shape: progress_at(shape, at) for shape in SHAPES}
    for apart in range(1, FURTHEST + 1):
        inside = alive + apart < ends[alive]
        alive, low, high, fall, rise = (part[inside] for part in (alive, low, high, fall, rise))
        if not len(alive):
            break
        there = alive + apart
        now = share[there]
        high, low = np.maximum(high, now), np.minimum(low, now)
        fall, rise = np.maximum(fall, high - now), np.maximum(rise, now - low)
        # No shape turns back: what was played may, by what the slack hides.
        one_way = np.minimum(fall, rise) <= 2.0 * np.maximum(slack[alive], slack[there])
        alive, low, high, fall, rise, there = (part[one_way] for part in (alive, low, high, fall, rise, there))
        if not len(alive):
            break
        if only is None:
            source = alive
        else:
            wanted = (only.fresh[alive] | only.fresh[there]) & (only.stage[alive] != only.stage[there])
            source, there = alive[wanted], there[wanted]
        begin, lasts = places.time_s[source], places.time_s[there] - places.time_s[source]
        when = begin + at[:, None] * lasts
        met = played.at(played.share, places.series[source], when)
        room = slacks * played.slack_at(places.series[source], when)
        way = share[there] - share[source]
        straight = np.abs(way) <= FLAT * slack[there]
        met -= share[source]
        for shape in SHAPES:
            fits = np.all(np.abs(met - way * gone[shape][:, None]) <= room, axis=0)
            if shape != "linear":
                fits &= ~straight
            found.append((source[fits], there[fits], NAMES.index(shape)))
        fast = sudden[there] & (np.abs(way) > 3.0 * slack[there])
        if fast.any():
            found.append((source[fast], there[fast], SUDDEN))
    sizes = [len(source) for source, _, _ in found]
    shapes = np.repeat(np.array([shape for _, _, shape in found], dtype=np.int8), sizes)
    if not found:
        return np.empty(0, np.int64), np.empty(0, np.int64), shapes
    return np.concatenate([f[0] for f in found]), np.concatenate([f[1] for f in found]), shapes


def _arrives_fast(played: Played, places: Places) -> NDArray[np.bool_]:
    """Whether what was played comes to each place about as fast as it can."""
    before = 4.0 * played.step_s
    was = played.at(played.share, places.series, places.time_s - before)
    was_then = played.at(played.share, places.series, places.time_s - 2.0 * before)
    late, soon = places.share - was, was - was_then
    speed = np.where(np.abs(late) > np.abs(soon), late, soon) / before
    fastest = played.rates_at(places.series, places.share, speed > 0.0)
    may = np.array([clock is not None for clock in played.clocks])[places.series]
    return may & (np.abs(speed) > FAST * fastest)
