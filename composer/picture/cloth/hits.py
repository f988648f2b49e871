"""Where moves land, ready for asking: what a pointer is near, what is in view, what one number of the text moves together."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from composer.tracks import HOLD, Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]


LEAST_MOVE_S = 1e-3
"""A hit that moves less than this is where it was."""


@dataclass(frozen=True, slots=True, eq=False)
class Hits:
    """N hits in order of fiber and time, (N,) each: the segment (index into the tracks) that lands, its fiber, when, in s.

    keys: fiber times `span` plus instant, rising
    """

    segment: Index
    fiber: Index
    at_s: Array
    keys: Array
    span: float


@lru_cache(maxsize=1)
def hits_of(tracks: Tracks) -> Hits:
    """The hits of tracks: the end of every segment that is no hold."""
    segment = np.flatnonzero(tracks.manner != HOLD)
    fiber = fiber_of(tracks)[segment]
    at = tracks.time_s[np.minimum(segment + 1, len(tracks.time_s) - 1)]
    span = float(tracks.time_s.max(initial=0.0)) + 2.0
    return Hits(segment, fiber, at, fiber * span + at, span)


@lru_cache(maxsize=1)
def moved_hits(tracks: Tracks, ghost: Tracks) -> tuple[Index, Array, Array]:
    """The hits that are at another instant in `ghost`, (M,) each: fiber, instant here, instant there; none of other knots."""
    hits = hits_of(tracks)
    if len(ghost.time_s) != len(tracks.time_s) or not np.array_equal(ghost.first, tracks.first):
        return hits.fiber[:0], hits.at_s[:0], hits.at_s[:0]
    there = ghost.time_s[np.minimum(hits.segment + 1, len(ghost.time_s) - 1)]
    moved = np.abs(there - hits.at_s) > LEAST_MOVE_S
    return hits.fiber[moved], hits.at_s[moved], there[moved]


def nearest(hits: Hits, fiber: int, at_s: float, within_s: float) -> int:
    """The index of the hit of a fiber that is nearest to an instant, -1 for none within `within_s`."""
    if not len(hits.keys):
        return -1
    place = int(np.searchsorted(hits.keys, fiber * hits.span + at_s))
    best, apart = -1, within_s
    for index in (place - 1, place):
        if 0 <= index < len(hits.keys) and hits.fiber[index] == fiber and abs(hits.at_s[index] - at_s) <= apart:
            best, apart = index, abs(float(hits.at_s[index]) - at_s)
    return best


def in_view(hits: Hits, fibers: range, from_s: float, to_s: float, most: int) -> Index | None:
    """The indices of hits of some fibers in a stretch of time; None where there are more than `most`."""
    each = np.arange(fibers.start, fibers.stop)
    begin = np.searchsorted(hits.keys, each * hits.span + max(from_s, 0.0))
    end = np.searchsorted(hits.keys, each * hits.span + min(to_s, hits.span - 1.0), side="right")
    count = np.maximum(end - begin, 0)
    total = int(count.sum())
    if total > most:
        return None
    return np.repeat(begin - np.concatenate([[0], np.cumsum(count)[:-1]]), count) + np.arange(total)


def moved_together(tracks: Tracks, segment: int) -> Index:
    """The segments that one line of a phrase makes, wherever the phrase is played; of a line elsewhere, its entry's."""
    if tracks.phrase_line[segment]:
        return np.flatnonzero((tracks.phrase_line == tracks.phrase_line[segment]) & (tracks.manner != HOLD))
    if tracks.line[segment]:
        return np.flatnonzero((tracks.line == tracks.line[segment]) & (tracks.phrase_line == 0) & (tracks.manner != HOLD))
    return np.array([segment])
