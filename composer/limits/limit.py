"""A limit: one kind of thing that a fiber or the supply cannot do, as checker, retimer and pictures ask about it."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.snag import Snag
from composer.rig.model import Rig
from composer.tracks import Tracks

TOLERANCE = 1e-6
"""Relative: a limit is broken by more than this or not at all, so that rounding never makes a snag."""


@dataclass(frozen=True, slots=True)
class Limit:
    """One limit.

    kind, unit: as in `Snag`
    about: what it says, in one line, for people
    snags: every stretch of the tracks that breaks it, exactly
    least_s: for a limit that a move meets by lasting longer: least seconds of each of some segments, (K,)
    """

    kind: str
    unit: str
    about: str
    snags: Callable[[Tracks, Rig, Abilities], list[Snag]]
    least_s: Callable[[Tracks, Abilities, NDArray[np.int64] | None], NDArray[np.float64]] | None = None
