"""Which single moves stay within the slack of what was played, from which target at which place to which at which."""

from collections.abc import Callable
from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray

from composer.limits.duration import PEAK_ACCELERATION
from composer.shapes import NAMES, PROGRESS
from player.takes.places import LEVELS, Places
from player.takes.played import Array, Clock, Index, Played

SHAPES = ("linear", "smooth", "swell", "settle")
"""Shapes that are weighed everywhere; a linear move between equal targets is a hold."""

SUDDEN = NAMES.index("sudden")

FURTHEST = 400
"""Places that one move may span."""

EARLY = np.array([0.2, 0.4, 0.6, 0.8])
"""Shares of a move's time at which most moves that do not fit are found out at a glance."""

GLANCE = (np.arange(8) + 0.5) / 8
ROUGH = 1.3
"""Slacks by which a move may be off that only about fits: a better place or target nearby may mend so much."""

EVEN = 8
"""Instants of a move at even distances at which it is held against what was played, besides those that are watched."""

GOING = 32
"""Instants of a sudden move while it goes."""

SUDDENS = 1024
"""Sudden moves worked out at once."""

BLOCK = 1 << 17
"""Values worked out at once."""

ROOM = 0.97
"""Of the slack: what lies between the instants looked at may be worse than they are by the rest."""

NOT_QUITE = 0.995
"""Of the fastest rate: rates are looked up at some instants, and between the strains of a table."""

FLAT = 2.0
"""Slacks: over so short a way every shape is as good as a straight line."""

FAST = 0.7
"""Of the fastest rate: what goes slower than this as it arrives is no sudden move."""


def _progress(shape: str, u: Array) -> Array:
    return np.polynomial.polynomial.polyval(u, PROGRESS[shape])


def _speed(shape: str, u: Array) -> Array:
    return np.polynomial.polynomial.polyval(u, np.polynomial.polynomial.polyder(PROGRESS[shape]))


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
    watch = _Watch(places, watched)
    lots = []
    for shape in SHAPES:
        mine = shapes == NAMES.index(shape)
        lots.append(_fitting(played, places, sources[mine], targets[mine], shape, watch))
    mine = shapes == SUDDEN
    lots.append(_suddens(played, places, sources[mine], targets[mine], watch))
    return Moves(*(np.concatenate([lot[part] for lot in lots]) for part in range(4)))


def roughly(played: Played, places: Places, pairs: Likely) -> Moves:
    """Those of some moves that would about fit if they went from what was played to what was played; targets do not count."""
    sources, targets, shapes = pairs
    good = np.zeros(len(sources), dtype=bool)
    for shape in SHAPES:
        mine = np.flatnonzero(shapes == NAMES.index(shape))
        gone = _progress(shape, GLANCE)
        for begin in range(0, len(mine), BLOCK // len(GLANCE)):
            part = mine[begin : begin + BLOCK // len(GLANCE)]
            source, target = sources[part], targets[part]
            begins, lasts = places.time_s[source], places.time_s[target] - places.time_s[source]
            met = played.at(played.share, places.series[source], begins + GLANCE[:, None] * lasts)
            curve = places.share[source] + (places.share[target] - places.share[source]) * gone[:, None]
            room = ROUGH * np.minimum(places.slack[source], places.slack[target])
            good[part] = np.all(np.abs(curve - met) <= room, axis=0)
    for series in np.unique(places.series[sources[shapes == SUDDEN]]):
        mine = np.flatnonzero((shapes == SUDDEN) & (places.series[sources] == series))
        for up in (True, False):
            part = mine[(places.share[targets[mine]] > places.share[sources[mine]]) == up]
            if len(part):
                way = _Sudden(played, places, played.clocks[series], sources[part], targets[part], up)
                good[part] = np.all(np.abs(way.curve(way.b)(way.a) - way.met) <= ROUGH / ROOM * way.slack, axis=1)
    masks = np.zeros((int(good.sum()), LEVELS), dtype=np.uint8)
    masks[:, 0] = 1
    return Moves(sources[good], targets[good], shapes[good], masks)


def likely(played: Played, places: Places) -> Likely:
    """The moves that pass a glance. All that fit are among them, but for bent ones that hardly differ from straight ones."""
    count = len(places.place)
    share, slack = places.share, places.slack
    alive = np.arange(count)
    low, high = share.copy(), share.copy()
    fall, rise = np.zeros(count), np.zeros(count)
    ends = places.first[places.series + 1]
    sudden = _arrives_fast(played, places)
    found: list[tuple[Index, Index, int]] = []
    early = {shape: _progress(shape, EARLY) for shape in SHAPES}
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
        begin, lasts = places.time_s[alive], places.time_s[there] - places.time_s[alive]
        met = played.at(played.share, places.series[alive], begin + EARLY[:, None] * lasts)
        room = 2.0 * played.slack_at(places.series[alive], begin + EARLY[:, None] * lasts)
        way = share[there] - share[alive]
        straight = np.abs(way) <= FLAT * slack[there]
        met -= share[alive]
        for shape in SHAPES:
            fits = np.all(np.abs(met - way * early[shape][:, None]) <= room, axis=0)
            if shape != "linear":
                fits &= ~straight
            found.append((alive[fits], there[fits], NAMES.index(shape)))
        fast = sudden[there] & (np.abs(way) > 3.0 * slack[there])
        if fast.any():
            found.append((alive[fast], there[fast], SUDDEN))
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


def _fitting(played: Played, places: Places, source: Index, target: Index, shape: str, watch: "_Watch") -> tuple:
    """The moves of one shape that fit, with their masks."""
    number = NAMES.index(shape)
    points = watch.points(source, target)
    masks = np.zeros((len(source), LEVELS), dtype=np.uint8)
    for many in np.unique(points):
        mine = np.flatnonzero(points == many)
        size = max(1, BLOCK // ((int(many) + EVEN) * LEVELS))
        for begin in range(0, len(mine), size):
            part = mine[begin : begin + size]
            when = watch.instants(source[part], target[part], int(many))
            masks[part] = _masks(played, places, source[part], target[part], when, shape, number)
    good = np.flatnonzero(masks.any(axis=1))
    return source[good], target[good], np.full(len(good), number, dtype=np.int8), masks[good]


class _Watch:
    """The instants at which a move is held against what was played: some evenly, and those between which it is straight."""

    def __init__(self, places: Places, watched: list[Array]):
        self.places = places
        self.time_s = np.concatenate(watched)
        first = np.concatenate([[0], np.cumsum([len(times) for times in watched])])
        self.low = np.empty(len(places.place), dtype=np.int64)
        for series, times in enumerate(watched):
            mine = slice(places.first[series], places.first[series + 1])
            self.low[mine] = first[series] + np.searchsorted(times, places.time_s[mine], side="right")

    def points(self, source: Index, target: Index) -> Index:
        """How many watched instants each move is held to: a power of two, 256 at most, (E,)."""
        inside = np.maximum(self.low[target] - self.low[source], 1)
        return 2 ** np.clip(np.ceil(np.log2(inside)), 0, 8).astype(np.int64)

    def instants(self, source: Index, target: Index, many: int) -> Array:
        """The instants of some moves, (E, many + EVEN)."""
        begin, end = self.places.time_s[source][:, None], self.places.time_s[target][:, None]
        inside = (self.low[target] - self.low[source])[:, None]
        at = np.minimum(self.low[source][:, None] + (np.arange(many) * inside) // many, len(self.time_s) - 1)
        even = begin + (np.arange(EVEN) + 0.5) / EVEN * (end - begin)
        return np.concatenate([np.clip(self.time_s[at], begin, end), even], axis=1)


def _masks(
    played: Played, places: Places, source: Index, target: Index, when: Array, shape: str, number: int
) -> NDArray[np.uint8]:
    """For each target at the source, the targets at the far end between the lowest and the highest that all instants allow."""
    series = places.series[source]
    begin, lasts = places.time_s[source], places.time_s[target] - places.time_s[source]
    u = (when - begin[:, None]) / lasts[:, None]
    met = played.at(played.share, series[:, None], when)
    slack = ROOM * played.slack_at(series[:, None], when)
    gone = _progress(shape, u)
    weight = np.maximum(gone, 1e-9)
    steepest = _speed(shape, u) + 1e-9
    # Rates are looked up where the curve is that goes from what was played to what was played.
    way = places.share[target] - places.share[source]
    fastest = played.rates_at(series[:, None], places.share[source][:, None] + way[:, None] * gone, (way > 0.0)[:, None])
    reach = lasts * (fastest / steepest).min(axis=1) * NOT_QUITE
    reach[places.free[source]] = np.inf
    bend = played.bend[series] * lasts**2 / max(PEAK_ACCELERATION[number], 1e-12) * NOT_QUITE
    reach = np.minimum(reach, bend)[:, None]

    levels = _levels(places, source)
    # (1 - w) a + w b within the slack of what was played, at every instant, is a bound on b for each a.
    top = ((met + slack) / weight)[:, None, :] - levels[:, :, None] * ((1.0 - gone) / weight)[:, None, :]
    bottom = top - (2.0 * slack / weight)[:, None, :]
    high = np.minimum(top.min(axis=2), levels + reach)
    low = np.maximum(bottom.max(axis=2), levels - reach)
    grain, lowest = places.grain[target][:, None], places.lowest[target][:, None]
    first = np.clip(np.ceil(np.nan_to_num(low, nan=1e9) / grain - 1e-9) - lowest, 0, LEVELS)
    last = np.clip(np.floor(np.nan_to_num(high, nan=-1e9) / grain + 1e-9) - lowest, -1, places.many[target][:, None] - 1)
    first, last = first.astype(np.int64), last.astype(np.int64)
    masks = np.where(last >= first, (2 << np.maximum(last, 0)) - (1 << first), 0)
    short = lasts < played.rest_s[series]
    if shape == "linear" and short.any():
        same = np.rint(levels / grain - lowest)
        holds = short[:, None] & (np.abs(levels - (lowest + same) * grain) < 1e-9) & (same >= 0) & (same < LEVELS)
        masks &= ~np.where(holds, 1 << np.clip(np.nan_to_num(same), 0, LEVELS).astype(np.int64), 0)
    return masks.astype(np.uint8)


def _levels(places: Places, source: Index) -> Array:
    """The targets weighed at some places, (E, LEVELS), nan where there are no more."""
    step = np.arange(LEVELS)
    levels = (places.lowest[source][:, None] + step) * places.grain[source][:, None]
    begins = places.first[places.series[source]] == source
    levels[begins, 0] = places.share[source[begins]]
    levels[step >= places.many[source][:, None]] = np.nan
    return levels


def _suddens(played: Played, places: Places, source: Index, target: Index, watch: "_Watch") -> tuple:
    """The sudden moves that fit: they wait, then go as fast as the fiber goes and arrive at the place."""
    masks = np.zeros((len(source), LEVELS), dtype=np.uint8)
    rising = places.share[target] > places.share[source]
    for series, up in product(np.unique(places.series[source]), (True, False)):
        mine = np.flatnonzero((places.series[source] == series) & (rising == up))
        for begin in range(0, len(mine), SUDDENS):
            part = mine[begin : begin + SUDDENS]
            clock = played.clocks[series]
            way = _Sudden(played, places, clock, source[part], target[part], up)
            # First with the values that were played, twice the slack being allowed.
            near = np.all(np.abs(way.curve(way.b)(way.a) - way.met) <= 2.0 * way.slack, axis=1)
            if near.any():
                part = part[near]
                masks[part] = _Sudden(played, places, clock, source[part], target[part], up, watch).masks(places)
    good = np.flatnonzero(masks.any(axis=1))
    return source[good], target[good], np.full(len(good), SUDDEN, dtype=np.int8), masks[good]


class _Sudden:
    """Some sudden moves of one series, one way, held against what was played at some instants over the whole of each and at
    more while it goes."""

    def __init__(
        self, played: Played, places: Places, clock: Clock, source: Index, target: Index, up: bool,
        watch: "_Watch | None" = None,
    ):  # fmt: skip
        self.clock_s, self.share, self.up = (clock.up_s if up else clock.down_s), clock.share, up
        self.source, self.target, series = source, target, places.series[source]
        self.a, self.b = places.share[source], places.share[target]
        self.lasts = places.time_s[target] - places.time_s[source]
        self.rest = played.rest_s[series]
        going = np.minimum(1.3 * self.takes(self.a, self.b) + 0.01, self.lasts)[:, None] * (np.arange(GOING) + 0.5) / GOING
        whole = self.lasts[:, None] * (np.arange(EVEN) + 0.5) / EVEN
        if watch is not None:
            watched = watch.instants(source, target, int(watch.points(source, target).max()))
            whole = places.time_s[target][:, None] - watched
        self.left = np.concatenate([going, whole], axis=1)
        when = places.time_s[target][:, None] - self.left
        self.met = played.at(played.share, series[:, None], when)
        self.slack = ROOM * np.broadcast_to(played.slack_at(series[:, None], when), self.met.shape)

    def takes(self, a: Array, b: Array) -> Array:
        """Seconds from a to b, below 0 the other way."""
        from_s, to_s = np.interp(a, self.share, self.clock_s), np.interp(b, self.share, self.clock_s)
        return to_s - from_s if self.up else from_s - to_s

    def curve(self, b: Array) -> Callable[[Array], Array]:
        """The curve that arrives at b, as a function of where it sets out."""
        clock = np.interp(b, self.share, self.clock_s)[:, None]
        on_way = np.interp(clock - self.left if self.up else clock + self.left, self.clock_s, self.share)
        return lambda a: (np.maximum if self.up else np.minimum)(on_way, a[:, None])

    def masks(self, places: Places) -> NDArray[np.uint8]:
        """For each target that they set out from, the targets at which they may arrive, as bits."""
        starts, stops = _levels(places, self.source), _levels(places, self.target)
        masks = np.zeros(starts.shape, dtype=np.uint8)
        far = 2.0 * places.slack[self.target]
        with np.errstate(invalid="ignore"):
            for b in range(LEVELS):
                arriving = self.curve(stops[:, b])
                for a in range(LEVELS):
                    takes = self.takes(starts[:, a], stops[:, b])
                    fits = (np.abs(starts[:, a] - stops[:, b]) > far) & (takes > 0.0)
                    fits &= takes <= self.lasts - np.maximum(1e-4 * self.lasts, self.rest)
                    fits &= np.all(np.abs(arriving(starts[:, a]) - self.met) <= self.slack, axis=1)
                    masks[fits, a] |= np.uint8(1 << b)
        return masks
