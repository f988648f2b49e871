"""The counts as sound: a click on each, higher on the first of a bar, as samples for any stretch of a piece at any speed."""

from itertools import pairwise
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

RATE_HZ = 44_100
CLICK_S = 0.045
FADE_S = 0.009
RISE_S = 0.0008
FIRST_HZ, OTHER_HZ = 1568.0, 1046.5
"""Pitches of a bar's first count and of the others: a fifth apart."""

NEAREST_S = 0.02
"""Counts closer together than this are not told apart by ear; of them only the first of a bar sounds."""


class Counted(Protocol):
    """Counts, seconds and bars of a piece, any shapes, from 0 at its start."""

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


def counts_between(piece: Counted, from_s: float, to_s: float) -> tuple[Array, NDArray[np.bool_]]:
    """The instants (N,) in s of the counts from `from_s` to before `to_s`, and which are the first of a bar, (N,)."""
    if to_s <= from_s:
        return np.zeros(0), np.zeros(0, dtype=bool)
    first = int(np.floor(float(piece.bars(piece.counts(from_s))) + 1e-9))
    last = int(np.ceil(float(piece.bars(piece.counts(to_s))) - 1e-9))
    edges = np.asarray(piece.counts_of_bars(np.arange(max(first, 0), max(last, 0) + 1)), dtype=float)
    counts, heads = [], []
    for begin, end in pairwise(edges):
        inside = np.arange(begin, end - 1e-9)
        counts.append(inside)
        heads.append(np.arange(len(inside)) == 0)
    if not counts:
        return np.zeros(0), np.zeros(0, dtype=bool)
    at = np.asarray(piece.seconds(np.concatenate(counts)), dtype=float)
    head = np.concatenate(heads)
    inside = (at >= from_s - 1e-9) & (at < to_s - 1e-9)
    return at[inside], head[inside]


def click(frequency_Hz: float) -> Array:
    """One click, samples (n,) from -1 to 1: a sine that rises within a millisecond and dies away."""
    time = np.arange(round(CLICK_S * RATE_HZ)) / RATE_HZ
    end = np.minimum(1.0, (CLICK_S - time) / 0.004)
    return np.sin(2.0 * np.pi * frequency_Hz * time) * np.exp(-time / FADE_S) * np.minimum(time / RISE_S, 1.0) * end


_FIRST, _OTHER = click(FIRST_HZ), click(OTHER_HZ)


def samples(piece: Counted, from_s: float, count: int, speed: float = 1.0, volume: float = 1.0) -> NDArray[np.int16]:
    """The next `count` samples (count,) of sound from `from_s` on, at `speed` times the pace, at a volume of 0 to 1.

    A click that began just before goes on into them, so that stretches that follow one another join without a seam.
    """
    mixed = np.zeros(count)
    before = CLICK_S * speed
    at, head = counts_between(piece, from_s - before, from_s + count / RATE_HZ * speed)
    apart = np.diff(at, prepend=-np.inf) >= NEAREST_S * speed
    for instant, strong, alone in zip(at.tolist(), head.tolist(), apart.tolist(), strict=True):
        if not (strong or alone):
            continue
        sound = _FIRST if strong else _OTHER
        begin = round((instant - from_s) / speed * RATE_HZ)
        low, high = max(begin, 0), min(begin + len(sound), count)
        if high > low:
            mixed[low:high] += sound[low - begin : high - begin]
    return np.rint(np.clip(mixed * volume, -1.0, 1.0) * 32767.0).astype(np.int16)
