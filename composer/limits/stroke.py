"""The limit of stroke: no strain above what the fiber can use, none below rest. Time does not mend it."""

import numpy as np

from composer.limits.abilities import Abilities
from composer.limits.duration import strain_range
from composer.limits.levels import lasting, past
from composer.limits.limit import Limit
from composer.limits.polynomials import extremes
from composer.limits.snag import Snag
from composer.limits.stretches import Pieces, as_snags, gather
from composer.rig.model import Rig
from composer.tracks import Tracks, fiber_of

SLACK = 1e-9
"""Strain past the limit that is taken for rounding."""


def snags(tracks: Tracks, rig: Rig, abilities: Abilities) -> list[Snag]:
    """Every stretch in which a strain is above the usable stroke or below rest: needs the worst strain, has the limit."""
    fiber = fiber_of(tracks)
    low, high = strain_range(tracks.curve, tracks.shape)
    stroke = abilities.stroke[fiber]
    lots = []
    for above, segments in ((True, np.flatnonzero(high > stroke + SLACK)), (False, np.flatnonzero(low < -SLACK))):
        if not len(segments):
            continue
        edge = stroke[segments] if above else np.zeros(len(segments))
        row, start, end = past(tracks, abilities, segments, edge + (SLACK if above else -SLACK), above)
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


def _worst(tracks: Tracks, segments: np.ndarray, above: bool) -> np.ndarray:
    """The greatest or least strain of each segment, (P,)."""
    return extremes(tracks.curve[segments])[1 if above else 0]


LIMIT = Limit("stroke", "1", "no strain above the usable stroke, none below rest", snags)
