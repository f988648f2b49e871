"""Air in a long score: each place where it is short is searched by itself, from one full receiver to another.

What lies outside a window stays where it is. Where a window's new times ask for too much elsewhere, that is a place of its own
in the next round.
"""

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.air import refill_L_s, store_L
from composer.retime.air_cuts import Span, overdrawn
from composer.retime.air_search import Found, Search
from composer.retime.cuts import Coiled
from composer.retime.flow import Budget
from composer.retime.local import Least
from composer.retime.rows import Rows, joined, no_rows
from composer.retime.stage import Stage, at_times
from composer.retime.terms import cost
from composer.rig.model import Rig

Array = NDArray[np.float64]

ROUNDS = 12
"""How often all places are looked for; each round leaves those before it in order."""

EVENTS = 100
"""Events that may move in one window."""

TRIES = ((3000, 12), (np.inf, 1))
"""Beginnings tried in each window, by how many events the score has."""

WIDER = 3.0
"""By what a window grows where no times in it are found."""


def by_windows(
    stage: Stage,
    rig: Rig,
    abilities: Abilities,
    rows: Rows,
    bottom: Least,
    short: tuple[list[Span], Array],
    budget: Budget,
) -> Found | None:
    """Times that keep every row and every span, found place by place from the optimum that asks too little, None if none are.

    short: the spans that the optimum overdraws, and instants at which the receiver is full, as `overdrawn` tells them
    Only where all keep the clock. Raises Unsolved where time is up.
    """
    events, full = stage.events, bottom.shift_s
    dual, air_dual = bottom.dual, np.empty(0)
    air, hot = no_rows(events), no_rows(events)
    known = Coiled()
    wider, tries = 1.0, next(tries for most, tries in TRIES if len(full) <= most)
    for number in range(ROUNDS):
        now = at_times(stage, full)
        spans, full_s = overdrawn(now, rig, abilities) if number else short
        more, coils = known.more(now, stage, rig, abilities)
        if not spans and not coils:
            forces = np.concatenate((dual, air_dual))
            return Found(replace(bottom, shift_s=full, cost=cost(stage.terms, full), dual=forces), joined([hot, air]))
        hot = joined([hot, more])
        dual = np.concatenate((dual, np.zeros(len(more.least))))
        kept = joined([rows, hot])
        places = spans + [(float(now.time_s[first]), float(now.time_s[last + 1])) for first, last in coils]
        done, missed = np.zeros(len(full), dtype=bool), False
        for free, window in _windows(places, full_s, events.written_s + full, wider, rig):
            if (free & done).any():
                continue
            budget.say(f"air: round {number + 1}, from {window[0]:.0f} s")
            here = replace(bottom, shift_s=full, cost=cost(stage.terms, full))
            search = Search(stage, rig, abilities, kept, here, free, budget, window)
            found = search.best(tries, None)
            done |= free
            if found is None:
                missed = True
                continue
            full = found.least.shift_s
            dual = dual.copy()
            dual[search.chosen] = found.least.dual[search.chosen]
            air_dual = np.concatenate((air_dual, found.least.dual[len(kept.least) :]))
            air = joined([air, found.shares])
        if missed:
            wider *= WIDER
    return None


def _windows(
    places: list[Span], full_s: Array, at_s: Array, wider: float, rig: Rig
) -> Iterator[tuple[NDArray[np.bool_], Span]]:
    """For each place the events that may move, (N,), and the time between two instants at which the receiver is full."""
    refill = refill_L_s(rig.supply)
    for from_s, to_s in places:
        reach = wider * max(to_s - from_s, 0.5 * store_L(rig.supply) / refill, 0.5)
        while True:
            free = (at_s >= from_s - reach) & (at_s <= to_s + reach)
            if np.count_nonzero(free) <= EVENTS * wider or reach < 0.05:
                break
            reach *= 0.7
        before, after = full_s[full_s <= from_s - reach], full_s[full_s >= to_s + reach]
        yield free, (float(before.max(initial=0.0)), float(after.min(initial=np.inf)))
