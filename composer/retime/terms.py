"""What displacement costs: terms of one event's shift, or of the shift between two, and the exact sum of all of them."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.retime.events import Events

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Terms:
    """T terms `weight * |shift[event] - shift[behind]|`; `behind` -1 stands still. As made here, term n is event n's."""

    event: Index
    behind: Index
    weight: Array


def all_terms(events: Events, rhythm: Flags) -> Terms:
    """One term an event: its own shift, or, where `rhythm` (N,), a hit's from the hit before and a start's from its hit."""
    numbers = np.arange(len(events.written_s))
    behind = np.where(rhythm, np.where(numbers < events.hits, numbers - 1, events.own_hit), -1)
    return Terms(numbers, np.where(behind == numbers, -1, behind), events.weight)


TILT = 1e-12
"""By what share an event is dearer than the one after it, for the solver alone: among equal costs the earlier ones stay."""


def tilted(events: Events, terms: Terms) -> tuple[Terms, float]:
    """The terms with ties broken, always alike however the work is divided, and the greatest factor put on any."""
    tilt = 1.0 + TILT * (len(events.place) - events.place)
    return Terms(terms.event, terms.behind, terms.weight * tilt), float(tilt.max(initial=1.0))


def cost(terms: Terms, shift_s: Array) -> float:
    """The sum of all terms, in stroke-seconds."""
    padded = np.append(shift_s, 0.0)
    return float(np.sum(terms.weight * np.abs(padded[terms.event] - padded[terms.behind])))


@dataclass(frozen=True, slots=True, eq=False)
class Contracted:
    """The terms that are left when only some events may move freely and all others go where it costs least.

    event, behind, weight: as in Terms, numbers of all events
    giver: (T,) for a term between two hits, the one whose own interval takes up the difference
    """

    event: Index
    behind: Index
    weight: Array
    giver: Index


def contract(events: Events, terms: Terms, free: Flags) -> Contracted:
    """The least that a choice of shifts for the `free` events, (N,), makes all other terms cost.

    Between two free hits with nothing but rhythm in between, the difference of their shifts is taken up by the interval
    that weighs least (the last such, so that earlier hits stay with those before them); behind the last free one,
    everything follows. A start that is not free follows what its own term names.
    """
    hits = events.hits
    events_, behind_, weight_, giver_ = [], [], [], []
    starts = np.flatnonzero(free[hits:]) + hits
    events_.append(starts), behind_.append(terms.behind[starts]), weight_.append(terms.weight[starts]), giver_.append(starts)
    chained = terms.behind[:hits] == np.arange(hits) - 1
    chained[:1] = False
    mine = np.flatnonzero(free[:hits])
    alone = mine[~chained[mine]]
    events_.append(alone), behind_.append(terms.behind[alone]), weight_.append(terms.weight[alone]), giver_.append(alone)
    linked = mine[chained[mine]]
    if len(linked):
        # A chain hangs from the last free hit before it, or from the last hit held by the clock, which can give as well.
        root = np.maximum.accumulate(np.where(free[:hits] | ~chained, np.arange(hits), 0))[linked - 1]
        giver, weight = lightest(terms.weight[:hits], np.where(free[root], root + 1, root), linked)
        anchor = np.where(free[root], root, -1)
        events_.append(linked), behind_.append(anchor), weight_.append(weight), giver_.append(giver)
    return Contracted(*(np.concatenate(part) for part in (events_, behind_, weight_, giver_)))


def lightest(weight: Array, low: Index, high: Index) -> tuple[Index, Array]:
    """The last place of the least of `weight[low..high]`, ends included, and that least, for each of many ranges."""
    at = np.empty(len(low), dtype=np.int64)
    for n, (a, b) in enumerate(zip(low.tolist(), high.tolist(), strict=True)):
        if a == b:
            at[n] = a
        else:
            at[n] = b - int(np.argmin(weight[a : b + 1][::-1]))
    return at, weight[at]


def spread(events: Events, terms: Terms, free: Flags, left: Contracted, shift_s: Array) -> Array:
    """Shifts of all events, (N,), from those of the free ones: the others go where `contract` reckoned with them."""
    hits = events.hits
    full = np.where(free, shift_s, 0.0)
    chained = terms.behind[:hits] == np.arange(hits) - 1
    if hits:
        chained[0] = False
    if chained.any():
        # From its giver on, a gap already has the shift of the free hit that ends it.
        known = free[:hits] | ~chained
        linked = left.event[left.giver != left.event]
        giver = left.giver[left.giver != left.event]
        jump = np.zeros(hits, dtype=bool)
        jump[giver] = True
        value = full[:hits].copy()
        value[giver] = full[linked]
        source = np.maximum.accumulate(np.where(known | jump, np.arange(hits), 0))
        full[:hits] = value[source]
    starts = np.arange(hits, len(full))
    follows = ~free[hits:] & (terms.behind[hits:] >= 0)
    full[starts[follows]] = full[terms.behind[starts[follows]]]
    return full
