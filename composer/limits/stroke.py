"""The limit of stroke: no strain above what the fiber can use, none below rest. Time does not mend it."""

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import strain_range
from composer.limits.levels import lasting, past, reaches
from composer.limits.limit import Limit
from composer.limits.polynomials import extremes
from composer.limits.quivering import shaken
from composer.limits.snag import Snag
from composer.limits.stretches import Pieces, as_snags, gather
from composer.limits.swings import strain_range_of
from composer.rig.model import Rig
from composer.tracks import Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

SLACK = 1e-9
"""Strain past the limit that is taken for rounding."""


def snags(tracks: Tracks, rig: Rig, abilities: Abilities) -> list[Snag]:
    """Every stretch in which a strain is above the usable stroke or below rest: needs the worst strain, has the limit."""
    fiber = fiber_of(tracks)
    low, high = reaches(tracks, *strain_range(tracks.curve, tracks.shape), np.arange(len(fiber)))
    stroke = abilities.stroke[fiber]
    lots = []
    for above, segments in ((True, np.flatnonzero(high > stroke + SLACK)), (False, np.flatnonzero(low < -SLACK))):
        if not len(segments):
            continue
        edge = stroke[segments] if above else np.zeros(len(segments))
        row, start, end = past(tracks, abilities, segments, edge + (SLACK if above else -SLACK), above)
        row, start, end = _swings_made_one(tracks, segments, row, start, end)
        of = segments[row]
        lasts = lasting(tracks)[of]
        lots.append(
            Pieces(
                fiber=fiber[of],
                from_s=tracks.time_s[of] + start * lasts,
                to_s=tracks.time_s[of] + end * lasts,
                needs=_worst(tracks, of, above),
                has=edge[row],
                knot=of,
                mends=np.zeros(len(of), dtype=bool),
            )
        )
    return as_snags("stroke", "1", gather(*lots), tracks) if lots else []


def _worst(tracks: Tracks, segments: Index, above: bool) -> Array:
    """The greatest or least strain of each segment, (P,)."""
    worst = extremes(tracks.curve[segments])[1 if above else 0]
    if (moves := shaken(tracks)) is not None:
        place, row = moves.of(segments)
        worst[place] = strain_range_of(tracks, moves, row)[1 if above else 0]
    return worst


def _swings_made_one(tracks: Tracks, segments: Index, row: Index, start: Array, end: Array) -> tuple[Index, Array, Array]:
    """The parts of segments past a level, those of a quiver that follow within a swing of each other as one."""
    moves = shaken(tracks)
    if moves is None or not len(row):
        return row, start, end
    swing_s = np.zeros(len(row))
    place, number = moves.of(segments[row])
    swing_s[place] = 1.0 / moves.hertz[number]
    gap = (start[1:] - end[:-1]) * lasting(tracks)[segments[row[1:]]]
    first = np.append(True, (row[1:] != row[:-1]) | (gap > swing_s[1:]))
    return row[first], start[first], end[np.append(first[1:], True)]


LIMIT = Limit("stroke", "1", "no strain above the usable stroke, none below rest", snags)
