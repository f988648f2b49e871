"""Takes of a control that came in steps: a few values a second, each of which a fiber goes to at once, as fast as it can."""

from collections.abc import Sequence

import numpy as np

from player.takes.fewest import Path
from player.takes.sudden import SUDDEN

FEW, SHARE = 8, 0.25
"""A take of at least so many quick moves, and this share of all its moves, was played in steps."""

QUICK_S = 0.15
"""A move shorter than this, or a sudden one, is a quick one."""

HALF_A_STEP = 0.6
"""Of a step, a little more than half: a curve that passes through the middle of steps is off them by so much."""

MOST_STEPS = 75.0
"""Per cent of the steps that a curve shall pass through."""


def tolerance_for_steps(paths: Sequence[Path]) -> float | None:
    """The tolerance, a share of stroke in whole hundredths, at which steps would be written as the curve through them; None for
    a take that was not played in steps."""
    way = [np.abs(np.diff(path.share)) for path in paths]
    quick = [(path.shape == SUDDEN) | (np.diff(path.time_s) < QUICK_S) for path in paths]
    steps = [far[those & (far > 1e-9)] for far, those in zip(way, quick, strict=True)]
    count, moves = sum(len(part) for part in steps), sum(int(np.count_nonzero(far > 1e-9)) for far in way)
    if count < FEW or count < SHARE * moves:
        return None
    return float(np.ceil(100.0 * HALF_A_STEP * np.percentile(np.concatenate(steps), MOST_STEPS) - 1e-9)) / 100.0
