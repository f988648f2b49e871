"""Rows of `hold`: no longer above half stroke than a fiber's `max_hold_s`."""

import numpy as np

from composer.limits.abilities import Abilities
from composer.limits.hold import runs_above_half
from composer.retime.events import Events
from composer.retime.rows import ABOVE_ROW, Rows, Sums, no_rows, sum_rows
from composer.tracks import Tracks, fiber_of


def hold_rows(tracks: Tracks, events: Events, abilities: Abilities, end: tuple[int, float]) -> Rows:
    """One row a run above half stroke of a fiber with a `max_hold_s`; `end` as in `sum_rows`.

    Where a run begins and ends within a move is a share of the move, whatever the times, so the rows are linear.
    """
    runs = runs_above_half(tracks, abilities)
    if not len(runs.run):
        return no_rows(events)
    opening = np.flatnonzero(np.diff(runs.run, prepend=-1))
    begin = runs.segment[opening]
    sums = Sums(runs.run, runs.segment, runs.share, abilities.max_hold_s[fiber_of(tracks)[begin]])
    return sum_rows(tracks, events, sums, ABOVE_ROW, begin, end)
