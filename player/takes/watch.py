"""The instants at which a move is held against what was played."""

import numpy as np

from player.takes.places import Places
from player.takes.played import Array, Index

EVEN = 8
"""Instants of a move at even distances, besides those that are watched."""

MIDDLES = (np.arange(EVEN) + 0.5) / EVEN

ROOM = 0.97
"""Of the slack: what lies between the instants looked at may be worse than they are by the rest."""

MOST_BITS = 8
"""Of the watched instants a move is held to, 256 at most."""


class Watch:
    """The instants at which a move is held against what was played: some evenly, and those between which it is straight."""

    def __init__(self, places: Places, watched: list[Array]):
        """watched: for each series the instants between which it is about straight, rising"""
        self.places = places
        self.time_s = np.concatenate(watched)
        first = np.concatenate([[0], np.cumsum([len(times) for times in watched])])
        self.low = np.empty(len(places.place), dtype=np.int64)
        for series, times in enumerate(watched):
            mine = slice(places.first[series], places.first[series + 1])
            self.low[mine] = first[series] + np.searchsorted(times, places.time_s[mine], side="right")

    def points(self, source: Index, target: Index) -> Index:
        """How many watched instants each move is held to: a power of two, (E,)."""
        inside = np.maximum(self.low[target] - self.low[source], 1)
        return 2 ** np.minimum(np.ceil(np.log2(inside)), MOST_BITS).astype(np.int64)

    def even(self, source: Index, target: Index) -> Array:
        """The even instants of some moves, (EVEN, E)."""
        begin = self.places.time_s[source]
        return begin + MIDDLES[:, None] * (self.places.time_s[target] - begin)

    def watched(self, source: Index, target: Index, many: int) -> Array:
        """So many watched instants of some moves, (many, E)."""
        first = self.low[source]
        inside = self.low[target] - first
        at = first + (np.arange(many)[:, None] * inside) // many
        np.minimum(at, len(self.time_s) - 1, out=at)
        return np.clip(self.time_s[at], self.places.time_s[source], self.places.time_s[target])
