"""Where air is short: cheaper times that the receiver bears, looked for from several beginnings.

Demand is no convex function of times, so what is found is the best near each beginning: successive linear programming with
an exact penalty (Fletcher and Sainz de la Maza 1989). The demand is made linear about the times at hand, the programme is
solved with a price on overdrawing, and as much of the step is taken as lessens cost and price together. All other rows are
convex, so a part of a step keeps them.
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.air import demand, refill_L_s, store_L
from composer.limits.buckets import overdraws
from composer.retime.air_cuts import overdrawn, share_rows
from composer.retime.cuts import duty_spans
from composer.retime.events import Events
from composer.retime.flow import Budget, Unsolved
from composer.retime.local import Least, least_cost
from composer.retime.rows import Rows, joined
from composer.retime.stage import Stage, at_times
from composer.retime.terms import cost
from composer.rig.model import Rig

Array = NDArray[np.float64]

NEAR = 0.1
"""Spans that fall short of overdrawing by no more than this share of the store are kept in view."""

STEPS, HARDEN, RAISES = 30, 12, 3
"""Steps of one search, rounds that make its answer clean, and how often the price is raised."""

ENOUGH = 1e-7
"""Relative: a step that promises less is the last."""

BEGINNINGS = ((300, 16), (1200, 4), (6000, 1))
"""How many beginnings are tried where no more than so many events may move; none above."""


@dataclass(frozen=True, slots=True, eq=False)
class Found:
    """Times that keep every row and every span, with the rows about them."""

    least: Least
    shares: Rows


def better(
    stage: Stage, rig: Rig, abilities: Abilities, rows: Rows, bottom: Least, best: Found | None, budget: Budget
) -> tuple[Found | None, bool]:
    """The cheapest of what is found from several beginnings and `best`, None where nothing is.

    bottom: the optimum of the rows that are true for all times, which ask too little
    Returns as well whether time was up before all were tried.
    """
    moving = int(np.count_nonzero(bottom.free))
    tries = next((tries for most, tries in BEGINNINGS if moving <= most), 0)
    begin = _beginnings(stage, bottom, best, tries)
    for number, start in enumerate(begin):
        budget.say(f"air: beginning {number + 1} of {len(begin)}")
        try:
            x = _descend(stage, rig, abilities, rows, bottom, start, budget)
            found = None if x is None else _hardened(stage, rig, abilities, rows, bottom, x, budget)
        except Unsolved:
            return best, True
        if found is not None and (best is None or found.least.cost < best.least.cost * (1.0 - 1e-9)):
            best = found
    return best, False


def _beginnings(stage: Stage, bottom: Least, best: Found | None, tries: int) -> list[Array]:
    """The optimum that asks too little, the best known, all moves left early, and some mixtures, always the same."""
    if not tries:
        return []
    events = stage.events
    starts = np.arange(events.hits, len(events.written_s))
    earliest = bottom.shift_s.copy()
    free = np.flatnonzero(events.free)
    before = events.event[free - 1]
    landed = np.where(before < 0, 0.0, np.append(events.written_s + bottom.shift_s, 0.0)[before])
    earliest[starts] = landed - events.written_s[starts]
    begin = [bottom.shift_s] + ([best.least.shift_s] if best is not None else [])
    if tries > 1:
        begin.append(earliest)
    rng = np.random.default_rng(1)
    from_there = bottom.shift_s if best is None else best.least.shift_s
    while len(begin) < tries:
        mixed = from_there.copy()
        share = rng.random(len(starts)) * (rng.random(len(starts)) < 0.5)
        mixed[starts] += share * np.minimum(earliest[starts] - bottom.shift_s[starts], 0.0)
        begin.append(mixed)
    return begin


def _descend(
    stage: Stage, rig: Rig, abilities: Abilities, rows: Rows, bottom: Least, start: Array, budget: Budget
) -> Array | None:
    """Times near some beginning that overdraw as little as may be, and cost as little."""
    events, x = stage.events, start
    price = 4.0 * max(1.0, float(bottom.dual.max(initial=0.0)), float(events.weight.max(initial=0.0)))
    for _ in range(RAISES):
        over, worth = _overdraft(stage, rig, abilities, x), cost(stage.terms, x)
        for _ in range(STEPS):
            now = at_times(stage, x)
            about = share_rows(overdrawn(now, rig, abilities, NEAR), now, events, x, rig, abilities)
            step = least_cost(events, joined([rows, about]), stage.terms, bottom.free, False, budget, price)
            if step is None:
                return None
            predicted = step.cost + price * float(np.maximum(about.least - about.matrix @ step.shift_s, 0.0).sum())
            merit = worth + price * over
            if merit - predicted <= ENOUGH * max(1.0, merit):
                break
            share, taken = 1.0, False
            while share > 1e-3:
                y = x + share * (step.shift_s - x)
                over_there, worth_there = _overdraft(stage, rig, abilities, y), cost(stage.terms, y)
                if worth_there + price * over_there < merit - 0.05 * share * (merit - predicted):
                    x, over, worth, taken = y, over_there, worth_there, True
                    break
                share *= 0.5
            if not taken:
                break
        if over <= 1e-6:
            break
        price *= 10.0
    return x


def _overdraft(stage: Stage, rig: Rig, abilities: Abilities, shift_s: Array) -> float:
    """By how many seconds of refill the spans are overdrawn, added up."""
    # By chords of the curves: near enough to choose a step by, and far quicker than the spans to the last digit.
    now = at_times(stage, shift_s)
    asked, refill = demand(now, abilities), refill_L_s(rig.supply)
    over = overdraws(asked.time_s, asked.litres, store_L(rig.supply), refill)
    return float((over.asked - over.bears).sum()) / refill


def _hardened(
    stage: Stage, rig: Rig, abilities: Abilities, rows: Rows, bottom: Least, x: Array, budget: Budget
) -> Found | None:
    """The optimum about some times, with rows added until the checker would find nothing; None where they clash."""
    events: Events = stage.events
    now = at_times(stage, x)
    about = share_rows(overdrawn(now, rig, abilities, NEAR), now, events, x, rig, abilities)
    for _ in range(HARDEN):
        found = least_cost(events, joined([rows, about]), stage.terms, bottom.free, False, budget)
        if found is None:
            return None
        now = at_times(stage, found.shift_s)
        spans = overdrawn(now, rig, abilities)
        if not spans:
            clean = not duty_spans(now, rig, abilities, set())
            return Found(replace(found, bound=bottom.bound), about) if clean else None
        about = joined([about, share_rows(spans, now, events, found.shift_s, rig, abilities)])
    return None
