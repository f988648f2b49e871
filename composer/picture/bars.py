"""Bars and counts in time as a picture needs them: a score's own tempo, or that of a retimed one."""

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.score.tempo import TempoMap
from composer.warp import along

Array = NDArray[np.float64]


class Bars(Protocol):
    """What a tempo map says, any shapes; counts, seconds and bars from 0 at the start."""

    def seconds(self, counts: ArrayLike) -> Array:
        """Seconds at `counts`."""
        ...

    def counts(self, seconds: ArrayLike) -> Array:
        """Counts at `seconds`."""
        ...

    def bars(self, counts: ArrayLike) -> Array:
        """Bars gone at `counts`."""
        ...

    def counts_of_bars(self, bars: ArrayLike) -> Array:
        """Counts when so many bars have gone."""
        ...

    def say_place(self, seconds: float) -> str:
        """Bar and count at `seconds`, as a person writes it."""
        ...


@dataclass(frozen=True, slots=True, eq=False)
class RetimedBars:
    """The bars of a retimed score: `was_s`, `now_s` (N,) rising, instants as written and where they have gone.

    Between them a straight line, before the first and beyond the last the written pace.
    """

    tempo: TempoMap
    was_s: Array
    now_s: Array

    def seconds(self, counts: ArrayLike) -> Array:
        """Seconds, as retimed, at `counts` of the score as written."""
        return along(self.tempo.seconds(counts), self.was_s, self.now_s)

    def counts(self, seconds: ArrayLike) -> Array:
        """Counts of the score as written at `seconds` as retimed."""
        return self.tempo.counts(along(seconds, self.now_s, self.was_s))

    def bars(self, counts: ArrayLike) -> Array:
        """Bars gone at `counts`."""
        return self.tempo.bars(counts)

    def counts_of_bars(self, bars: ArrayLike) -> Array:
        """Counts when so many bars have gone."""
        return self.tempo.counts_of_bars(bars)

    def say_place(self, seconds: float) -> str:
        """Bar and count, as written, of an instant as retimed."""
        return self.tempo.say_place(float(along(seconds, self.now_s, self.was_s)))
