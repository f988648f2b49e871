"""Safe ways: from where every fiber is to where it is to be, in the minimum-jerk profile, slower than it could."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import least_durations
from composer.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, Tracks

Array = NDArray[np.float64]

SAFE = 1.5
"""A safe way takes this many times as long as the fiber needs at least: its safe rate is two thirds of its fastest."""


@dataclass(frozen=True, slots=True, eq=False)
class Ways:
    """A way for every fiber, all begun at once: strains `a` to `b` (F,), each lasting `lasts_s` (F,), 0 where a is b."""

    a: Array
    b: Array
    lasts_s: Array

    @property
    def longest_s(self) -> float:
        """Seconds until the last fiber is there."""
        return float(self.lasts_s.max(initial=0.0))

    def at(self, gone_s: float) -> Array:
        """Strain (F,) when that much time has gone."""
        share = np.clip(np.divide(gone_s, self.lasts_s, out=np.ones_like(self.lasts_s), where=self.lasts_s > 0.0), 0.0, 1.0)
        progress = share**3 * (10.0 + share * (6.0 * share - 15.0))
        return np.where(share >= 1.0, self.b, self.a + (self.b - self.a) * progress)


def safe_ways(abilities: Abilities, a: Array, b: Array, margin: float = SAFE) -> Ways:
    """Ways from strain `a` (F,) to `b` (F,), each `margin` times as long as its fiber's rates and acceleration ask for."""
    least = least_durations(_moves(a, b), abilities)[::2]
    return Ways(a.copy(), b.copy(), np.where(a == b, 0.0, margin * least))


def _moves(a: Array, b: Array) -> Tracks:
    """One smooth move of one second for every fiber, so that what it takes at least can be asked."""
    fibers = len(a)
    curve = np.zeros((2 * fibers, 6))
    curve[::2] = (b - a)[:, None] * PROGRESS["smooth"]
    curve[::2, 0] += a
    curve[1::2, 0] = b
    nothing = np.zeros(2 * fibers, dtype=np.int32)
    return Tracks(
        first=np.arange(0, 2 * fibers + 1, 2),
        time_s=np.tile([0.0, 1.0], fibers),
        curve=curve,
        manner=np.tile(np.array([MOVE, HOLD], dtype=np.int8), fibers),
        shape=np.full(2 * fibers, NAMES.index("smooth"), dtype=np.int8),
        line=nothing,
        phrase_line=nothing,
        duration_s=1.0,
    )
