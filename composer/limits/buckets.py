"""Token buckets: a store that is full at the start, drained by demand, refilled at a steady rate up to its brim.

With D(t) all that was asked for up to t, what is missing from the brim at t is the greatest, over all s before t, of
D(t) - D(s) - refill (t - s). The store `sigma` holds out as long as that stays at most `sigma`, which is to say that the
demand keeps within sigma + refill L over every span of every length L: the (sigma, rho) constraint of Cruz 1991.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Level:
    """What is missing from the brim at some instants, and since which instant (an index) it went missing: (N,) each."""

    missing: Array
    since: Index


@dataclass(frozen=True, slots=True, eq=False)
class Overdraws:
    """The spans that overdraw a store, the deepest of each stretch in which it is not full again: (S,) each.

    start, end: indices of instants; asked, bears: the demand in the span, and store plus refill over it
    """

    start: Index
    end: Index
    asked: Array
    bears: Array


def level(time_s: Array, demand: Array, refill: float) -> Level:
    """What is missing at each of some rising instants; exact if the demand is a straight line between them.

    time_s, demand: (N,), demand the sum of all asked for up to each instant. Instants may be equal, as at a jump.
    """
    short = demand - refill * time_s
    lowest = np.minimum.accumulate(short)
    # The last instant at which the store was at its brim: the span from there on is the shortest that asks so much.
    since = np.maximum.accumulate(np.where(short == lowest, np.arange(len(short)), 0))
    return Level(short - lowest, since)


def overdraws(time_s: Array, demand: Array, store: float, refill: float, tolerance: float = 0.0) -> Overdraws:
    """The spans in which more is asked than a store bears: `demand` (N,) in the store's unit at rising times (N,) in s.

    `tolerance` is relative to the store; `refill` per s.
    """
    now = level(time_s, demand, refill)
    over = np.flatnonzero(now.missing > store * (1.0 + tolerance))
    if not len(over):
        none = np.empty(0, dtype=np.int64)
        return Overdraws(none, none, np.empty(0), np.empty(0))
    parted = np.flatnonzero(np.diff(now.since[over], prepend=-1))
    deepest = np.lexsort((over, -now.missing[over], now.since[over]))
    end = over[deepest[parted]]
    start = now.since[end]
    return Overdraws(start, end, demand[end] - demand[start], store + refill * (time_s[end] - time_s[start]))
