"""From the pieces of segments that break a limit to snags, one for each unbroken stretch of time on one fiber."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.snag import Snag
from composer.tracks import SAME_INSTANT_S, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Pieces:
    """Pieces of segments, (P,) each: fiber, from and to in seconds, needs, has, segment, whether time mends."""

    fiber: Index
    from_s: Array
    to_s: Array
    needs: Array
    has: Array
    knot: Index
    mends: NDArray[np.bool_]


NO_PIECES = Pieces(
    np.empty(0, dtype=np.int64), *(np.empty(0) for _ in range(4)), np.empty(0, dtype=np.int64), np.empty(0, dtype=bool)
)


def gather(*all_pieces: Pieces) -> Pieces:
    """Several lots of pieces as one."""
    return Pieces(*(np.concatenate([getattr(p, name) for p in all_pieces]) for name in Pieces.__slots__))


def picked(pieces: Pieces, which: NDArray[np.bool_]) -> Pieces:
    """Some of the pieces, (P,) flags."""
    return Pieces(*(getattr(pieces, name)[which] for name in Pieces.__slots__))


def join(fiber: Index, from_s: Array, to_s: Array) -> tuple[Index, Index]:
    """The order of pieces by fiber and time, and for each in that order the number of its unbroken stretch, from 0 on."""
    # Segments as they lie in tracks are in order already, and sorting is what takes long.
    step = np.diff(fiber)
    if np.all((step > 0) | ((step == 0) & (np.diff(from_s) >= 0.0))):
        order = np.arange(len(fiber))
    else:
        order = np.lexsort((from_s, fiber))
        fiber, from_s, to_s = fiber[order], from_s[order], to_s[order]
    parted = (fiber[1:] != fiber[:-1]) | (from_s[1:] > to_s[:-1] + SAME_INSTANT_S)
    return order, np.concatenate([[0], np.cumsum(parted)]) if len(order) else np.empty(0, dtype=np.int64)


def as_snags(kind: str, unit: str, pieces: Pieces, tracks: Tracks) -> list[Snag]:
    """The pieces as snags: touching ones of one fiber make one, told by its worst; time mends it if it mends every piece."""
    order, stretch = join(pieces.fiber, pieces.from_s, pieces.to_s)
    if not len(order):
        return []
    begin = np.flatnonzero(np.diff(stretch, prepend=-1))
    sorted_ = Pieces(*(getattr(pieces, name)[order] for name in Pieces.__slots__))
    excess = np.abs(sorted_.needs - sorted_.has) / np.maximum(np.abs(sorted_.has), 1e-12)
    by_excess = np.lexsort((-excess, stretch))
    worst = by_excess[begin]
    mends = np.logical_and.reduceat(sorted_.mends, begin)
    to = np.maximum.reduceat(sorted_.to_s, begin)
    return [
        Snag(
            kind=kind,
            fiber=int(sorted_.fiber[b]),
            from_s=float(sorted_.from_s[b]),
            to_s=float(t),
            needs=float(sorted_.needs[w]),
            has=float(sorted_.has[w]),
            unit=unit,
            knot=int(sorted_.knot[w]),
            line=line_of(tracks, int(sorted_.knot[w])),
            mends=bool(m),
        )
        for b, t, w, m in zip(begin, to, worst, mends, strict=True)
    ]


def line_of(tracks: Tracks, knot: int) -> int:
    """The line of the score to blame for a segment: a hold that has none is owed to the move that led into it."""
    first = tracks.first[np.searchsorted(tracks.first, knot, side="right") - 1]
    while tracks.line[knot] == 0 and knot > first:
        knot -= 1
    return int(tracks.line[knot])
