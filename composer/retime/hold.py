"""Rows of `hold`: no longer above half stroke than a fiber's `max_hold_s`."""

import numpy as np

from composer.limits.abilities import Abilities
from composer.limits.hold import runs_above_half
from composer.retime.events import Events
from composer.retime.rows import ABOVE_ROW, Rows, Sums, no_rows, sum_rows
from composer.tracks import Tracks, fiber_of


def hold_rows(tracks: Tracks, events: Events, abilities: Abilities) -> Rows:
    """One row a run above half stroke of a fiber with a `max_hold_s`.

    Where a run begins and ends within a move is a share of the move, whatever the times, so the rows are linear. A fiber
    that ends the score above half stroke is left to the checker: only to rest it would help, not to arrive later.
    """
    runs = runs_above_half(tracks, abilities)
    if not len(runs.run):
        return no_rows(events)
    endless = np.isin(runs.segment, tracks.first[1:] - 1)
    kept = ~np.isin(runs.run, runs.run[endless])
    if not kept.any():
        return no_rows(events)
    _, run = np.unique(runs.run[kept], return_inverse=True)
    segment = runs.segment[kept]
    begin = segment[np.flatnonzero(np.diff(run, prepend=-1))]
    sums = Sums(run, segment, runs.share[kept], abilities.max_hold_s[fiber_of(tracks)[begin]])
    return sum_rows(tracks, events, sums, ABOVE_ROW, begin)
