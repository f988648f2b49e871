"""Sudden moves: which of them stay within the slack of what was played, from which target to which."""

from itertools import product

import numpy as np
from numpy.typing import NDArray

from composer.shapes import NAMES
from player.takes.places import LEVELS, ROOM, Places
from player.takes.played import Array, Clock, Index, Played
from player.takes.watch import MIDDLES, Watch

SUDDEN = NAMES.index("sudden")

GOING, GLANCED = 32, 6
"""Instants of a sudden move while it goes, and at a glance."""

AT_ONCE = 1024
"""Sudden moves worked out at once."""


def suddens(played: Played, places: Places, source: Index, target: Index, watch: Watch) -> tuple:
    """The sudden moves that fit: they wait, then go as fast as the fiber goes and arrive at the place."""
    masks = np.zeros((len(source), LEVELS), dtype=np.uint8)
    rising = places.share[target] > places.share[source]
    for series, up in product(np.unique(places.series[source]), (True, False)):
        mine = np.flatnonzero((places.series[source] == series) & (rising == up))
        for begin in range(0, len(mine), AT_ONCE):
            part = mine[begin : begin + AT_ONCE]
            clock = played.clocks[series]
            way = Sudden(played, places, clock, source[part], target[part], up, going=GLANCED)
            # First with the values that were played, twice the slack being allowed.
            near = np.all(np.abs(way.curve() - way.met) <= 2.0 * way.slack, axis=1)
            if near.any():
                part = part[near]
                masks[part] = Sudden(played, places, clock, source[part], target[part], up, watch).masks(places)
    good = np.flatnonzero(masks.any(axis=1))
    return source[good], target[good], np.full(len(good), SUDDEN, dtype=np.int8), masks[good]


class Sudden:
    """Some sudden moves of one series, one way, held against what was played at some instants over the whole of each and at
    more while it goes."""

    def __init__(
        self, played: Played, places: Places, clock: Clock, source: Index, target: Index, up: bool,
        watch: Watch | None = None, going: int = GOING,
    ):  # fmt: skip
        self.clock_s, self.share, self.up = (clock.up_s if up else clock.down_s), clock.share, up
        self.source, self.target, series = source, target, places.series[source]
        self.a, self.b = places.share[source], places.share[target]
        self.lasts = places.time_s[target] - places.time_s[source]
        self.rest = played.rest_s[series]
        going = np.minimum(1.3 * self.takes(self.a, self.b) + 0.01, self.lasts)[:, None] * (np.arange(going) + 0.5) / going
        whole = self.lasts[:, None] * MIDDLES
        if watch is not None:
            watched, _, _ = watch.watched(source, target, int(watch.points(source, target).max()))
            watched = np.clip(watched, places.time_s[source], places.time_s[target])
            whole = np.concatenate([whole, (places.time_s[target] - watched).T], axis=1)
        self.left = np.concatenate([going, whole], axis=1)
        when = places.time_s[target][:, None] - self.left
        self.met = played.at(played.share, series[:, None], when)
        self.slack = ROOM * np.broadcast_to(played.slack_at(series[:, None], when), self.met.shape)

    def takes(self, a: Array, b: Array) -> Array:
        """Seconds from a to b, below 0 the other way."""
        from_s, to_s = np.interp(a, self.share, self.clock_s), np.interp(b, self.share, self.clock_s)
        return to_s - from_s if self.up else from_s - to_s

    def on_way(self, b: Array) -> Array:
        """Where the moves that arrive at b are while they go, had they set out long before."""
        clock = np.interp(b, self.share, self.clock_s)[:, None]
        return np.interp(clock - self.left if self.up else clock + self.left, self.clock_s, self.share)

    def curve(self) -> Array:
        """Where they are from a to b."""
        return (np.maximum if self.up else np.minimum)(self.on_way(self.b), self.a[:, None])

    def masks(self, places: Places) -> NDArray[np.uint8]:
        """For each target that they set out from, the targets at which they may arrive, as bits."""
        starts, stops = places.targets_of(self.source).T, places.targets_of(self.target).T
        masks = np.zeros(starts.shape, dtype=np.uint8)
        far, last = 2.0 * places.slack[self.target], self.lasts - np.maximum(1e-4 * self.lasts, self.rest)
        top, bottom = self.met + self.slack, self.met - self.slack
        lowest, highest = bottom.max(axis=1), top.min(axis=1)
        with np.errstate(invalid="ignore"):
            for b in range(int(places.many[self.target].max(initial=0))):
                low, high = self._between(stops[:, b], top, bottom, lowest, highest)
                for a in range(int(places.many[self.source].max(initial=0))):
                    takes = self.takes(starts[:, a], stops[:, b])
                    fits = (np.abs(starts[:, a] - stops[:, b]) > far) & (takes > 0.0) & (takes <= last)
                    fits &= (starts[:, a] >= low) & (starts[:, a] <= high)
                    masks[fits, a] |= np.uint8(1 << b)
        return masks

    def _between(self, b: Array, top: Array, bottom: Array, lowest: Array, highest: Array) -> tuple[Array, Array]:
        """From where to where moves that arrive at b may set out, so that they stay within bounds; nowhere: low above high."""
        on_way = self.on_way(b)
        if self.up:
            waits = np.where(on_way < bottom, bottom, -np.inf).max(axis=1)
            return np.where((on_way <= top).all(axis=1), waits, np.inf), highest
        waits = np.where(on_way > top, top, np.inf).min(axis=1)
        return lowest, np.where((on_way >= bottom).all(axis=1), waits, -np.inf)
