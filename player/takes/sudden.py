"""Sudden moves: which of them stay within the slack of what was played, from which target to which."""

from collections.abc import Callable
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
            near = np.all(np.abs(way.curve(way.b)(way.a) - way.met) <= 2.0 * way.slack, axis=1)
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

    def curve(self, b: Array) -> Callable[[Array], Array]:
        """The curve that arrives at b, as a function of where it sets out."""
        clock = np.interp(b, self.share, self.clock_s)[:, None]
        on_way = np.interp(clock - self.left if self.up else clock + self.left, self.clock_s, self.share)
        return lambda a: (np.maximum if self.up else np.minimum)(on_way, a[:, None])

    def masks(self, places: Places) -> NDArray[np.uint8]:
        """For each target that they set out from, the targets at which they may arrive, as bits."""
        starts, stops = places.targets_of(self.source).T, places.targets_of(self.target).T
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
