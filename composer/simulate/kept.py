"""What of a run is kept to be drawn: a column for each pixel, whatever the run's length."""

import numpy as np
from numpy.typing import NDArray

from composer.simulate.run import Block

Array = NDArray[np.float64]


class Kept:
    """Watches a run: `add` every block in order; then there is a value for each of the `times_s` (W,) asked for, evenly apart.

    strain: (F, W) float32, at the last tick up to each time
    supply_kPa, duty, miss: (W,) over each column the lowest pressure, the highest use of a duty, and the greatest
        |strain - target| as a share of stroke
    """

    def __init__(self, times_s: Array, stroke: Array):
        width = len(times_s)
        gap = (times_s[-1] - times_s[0]) / (width - 1) if width > 1 else 1.0
        self.times_s = times_s
        self.strain = np.zeros((len(stroke), width), dtype=np.float32)
        self.supply_kPa = np.full(width, np.nan)
        self.duty, self.miss = np.full(width, np.nan), np.full(width, np.nan)
        self._stroke = stroke
        self._edges = times_s[0] - gap / 2 + gap * np.arange(width + 1)
        self._filled = 0

    def add(self, block: Block) -> None:
        """Take in the next ticks."""
        upto = int(np.searchsorted(self.times_s, block.time_s[-1], side="right"))
        columns = np.arange(self._filled, upto)
        tick = np.maximum(np.searchsorted(block.time_s, self.times_s[columns], side="right") - 1, 0)
        self.strain[:, columns] = block.strain[:, tick]
        wrong = np.abs(block.strain - block.target)
        miss = (wrong / self._stroke[:, None]).max(axis=0, initial=0.0)
        for kept, values, keep in (
            (self.supply_kPa, block.supply_kPa, np.fmin),
            (self.duty, block.duty, np.fmax),
            (self.miss, miss, np.fmax),
        ):
            # Every tick goes into its own column; a column finer than the ticks takes the tick before it.
            own = np.searchsorted(self._edges, block.time_s, side="right") - 1
            inside = (own >= 0) & (own < len(kept))
            keep.at(kept, own[inside], values[inside])
            kept[columns] = np.where(np.isnan(kept[columns]), values[tick], kept[columns])
        self._filled = upto
