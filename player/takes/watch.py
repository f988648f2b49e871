"""The instants at which a move is held against what was played."""

import numpy as np

from player.takes.places import Places
from player.takes.played import Array, Index, Played

EVEN = 8
"""Instants of a move at even distances, besides those that are watched."""

MIDDLES = (np.arange(EVEN) + 0.5) / EVEN

MOST_BITS = 8
"""Of the watched instants a move is held to, 256 at most."""


class Watch:
    """The instants at which a move is held against what was played: some evenly, and those between which it is straight."""

    def __init__(self, played: Played, places: Places, watched: list[Array]):
        """watched: for each series the instants between which it is about straight, rising"""
        self.places = places
        series = np.repeat(np.arange(len(watched)), [len(times) for times in watched])
        self._time_s = np.concatenate(watched)
        self._share = played.at(played.share, series, self._time_s)
        self._slack = np.broadcast_to(played.slack_at(series, self._time_s), self._time_s.shape)
        first = np.searchsorted(series, np.arange(len(watched)))
        self._low, self._high = np.empty(len(places.place), dtype=np.int64), np.empty(len(places.place), dtype=np.int64)
        for series, times in enumerate(watched):
            mine = slice(places.first[series], places.first[series + 1])
            self._low[mine] = first[series] + np.searchsorted(times, places.time_s[mine], side="right")
            self._high[mine] = first[series] + np.searchsorted(times, places.time_s[mine], side="left")

    def points(self, source: Index, target: Index) -> Index:
        """How many watched instants each move is held to: a power of two, or none, (E,)."""
        inside = self._high[target] - self._low[source]
        return np.where(inside > 0, 2 ** np.minimum(np.ceil(np.log2(np.maximum(inside, 1))), MOST_BITS).astype(np.int64), 0)

    def even(self, source: Index, target: Index) -> Array:
        """The even instants of some moves, (EVEN, E)."""
        begin = self.places.time_s[source]
        return begin + MIDDLES[:, None] * (self.places.time_s[target] - begin)

    def watched(self, source: Index, target: Index, many: int) -> tuple[Array, Array, Array]:
        """So many watched instants of some moves, what was played then, and its slack, (many, E) each.

        Of one inside the move alone there is only that; a move without any is held to its source's next.
        """
        first = self._low[source]
        inside = np.maximum(self._high[target] - first, 1)
        at = first + (np.arange(many)[:, None] * inside) // many
        np.minimum(at, len(self._time_s) - 1, out=at)
        return self._time_s[at], self._share[at], self._slack[at]
