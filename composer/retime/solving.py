"""Solving the whole programme: rows added until the times break none, and rows given up that no times can keep."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.air import too_much_at_once
from composer.limits.fills import fills_of
from composer.quivers import NONE
from composer.retime.air_cuts import Span, overdrawn, plainly_enough, share_rows, whole_rows
from composer.retime.air_search import Found, better
from composer.retime.air_windows import by_windows
from composer.retime.cuts import Coiled, duty_rows, duty_spans
from composer.retime.flow import ENDLESS, Budget, Unsolved
from composer.retime.local import Least, least_cost
from composer.retime.parts import Parts
from composer.retime.polish import polish
from composer.retime.rows import ABOVE_ROW, AIR_ROW, PIN_ROW, SWITCH_ROW, Rows, joined, no_rows, picked
from composer.retime.stage import Stage, at_times
from composer.retime.switches import kept_apart, shut_rows, switch_rows
from composer.retime.terms import cost
from composer.rig.model import Rig
from composer.tracks import HOLD, STEP, SUDDEN, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]

ROUNDS = 200
"""How many rounds of cutting planes are tried; each adds at least one row that the times at hand break."""

AIR_ROUNDS = 40
"""How many rounds close in on times that keep the air."""

WINDOWS_FROM = 300
"""Scores of more events than this are searched place by place where they keep the clock."""

Hopeless = tuple[int, int]

GIVEN_UP_S = 1e-6
"""A row that even at a high price stays broken by more than this is one that no times can keep."""


@dataclass(frozen=True, slots=True, eq=False)
class Answer:
    """The optimum found, the rows that it was found with, and how many rows no times could keep.

    stopped: whether time was up, so that these are the best times known and not the best there are
    hopeless: the rows given up that no times keep even where no pin stands: kind and segment
    """

    least: Least
    rows: Rows
    given_up: int
    stopped: bool = False
    hopeless: tuple[Hopeless, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class _Bottom:
    """The optimum of the rows that are true for all times: it costs no more than any times that keep the air as well.

    spans: those that its times still overdraw; full_s: instants at which the receiver is full meanwhile
    no_air: no times keep the air even over whole moves, so what is left of it is the checker's to tell
    """

    least: Least
    rows: Rows
    given_up: int
    no_air: bool
    spans: list[Span]
    full_s: Array
    hopeless: tuple[Hopeless, ...]


def answer(
    stage: Stage,
    rig: Rig,
    abilities: Abilities,
    whole: bool = False,
    budget: Budget = ENDLESS,
    free: Flags | None = None,
) -> Answer | None:
    """The least-cost times that keep every row and every span, or None where pins leave none.

    Rows over more than two events that no times can keep are given up, as few as a high price on each finds.
    free: (N,) events to begin with, as an earlier solution moved them
    """
    try:
        bottom = _bottom(stage, rig, abilities, whole, budget, free)
    except Unsolved:
        known = _pushed(stage)
        if known is None:
            raise
        return Answer(known, stage.rows, 0, True)
    if bottom is None:
        return None
    if not bottom.spans:
        return Answer(bottom.least, bottom.rows, bottom.given_up, False, bottom.hopeless)
    found, stopped = Found(bottom.least, no_rows(stage.events)), False
    try:
        best, stopped = _best(stage, rig, abilities, bottom, budget)
        if best is None:
            closed = _closed_in(stage, rig, abilities, bottom, budget)
            found = found if closed is None else closed[0]
    except Unsolved:
        best, stopped = None, True
    found = found if best is None else best
    least = replace(found.least, bound=bottom.least.bound)
    return Answer(least, joined([bottom.rows, found.shares]), bottom.given_up, stopped, bottom.hopeless)


def _best(stage: Stage, rig: Rig, abilities: Abilities, bottom: _Bottom, budget: Budget) -> tuple[Found | None, bool]:
    """The best times that keep the air as well, None where none are found, and whether time was up before all was tried."""
    events = stage.events
    if len(events.written_s) > WINDOWS_FROM and not (stage.terms.behind[: events.hits] >= 0).any():
        found = by_windows(stage, rig, abilities, bottom.rows, bottom.least, (bottom.spans, bottom.full_s), budget)
        if found is not None:
            return found, False
    known = None
    closed = _closed_in(stage, rig, abilities, bottom, budget)
    if closed is not None and closed[1]:
        known = closed[0]
    return better(stage, rig, abilities, bottom.rows, bottom.least, bottom.spans, known, budget)


def _pushed(stage: Stage) -> Least | None:
    """Times found without a search, where there are some: what is broken pushes what follows, and pins what is before."""
    events, rows = stage.events, stage.rows
    shift = polish(events, rows, np.zeros(len(events.written_s)))
    if len(rows.short(shift)):
        return None
    every = np.ones(len(shift), dtype=bool)
    return Least(shift, cost(stage.terms, shift), 0.0, np.zeros(len(rows.least)), every)


def _bottom(stage: Stage, rig: Rig, abilities: Abilities, whole: bool, budget: Budget, free: Flags | None) -> _Bottom | None:
    """Cutting planes, each true for all times, until the times at hand break none of them."""
    events = stage.events
    rows, given_up, no_air = stage.rows, 0, False
    hopeless: list[Hopeless] = []
    # Beside what draws too much by itself all that is short of air would be moved in vain.
    if _at_once(stage.tracks, rig, abilities):
        no_air, hopeless = True, [(AIR_ROW, -1)]
    air: set[tuple[int, int]] = set()
    least, spans, full_s, parts = None, [], np.empty(0), Parts()
    # Below what was proven before a wait that had been opened was held to its coil: it might have stayed shut instead.
    proven = np.inf
    apart = kept_apart(stage.tracks, stage.least_s, rig, abilities)
    # What is asked too much of as written will most likely bind.
    hot = duty_spans(stage.tracks, rig, abilities, set())
    coils = Coiled(set(hot), set(apart))
    coil_rows = [switch_rows(apart, stage.tracks, events, rig), duty_rows(hot, stage.tracks, events, rig, abilities)]
    rows = joined([rows, *coil_rows]) if apart or hot else rows
    for number in range(ROUNDS):
        budget.say(f"round {number + 1}: {len(rows.least)} rows")
        least = least_cost(events, rows, stage.terms, free, whole, budget, parts=parts)
        if least is None:
            parts = Parts()
            lost = _unkeepable(stage, rows, whole, budget)
            if not lost.any():
                return None
            hopeless += _hopeless(stage, rows, lost, whole, budget)
            no_air |= bool((rows.kind[lost] == AIR_ROW).any())
            rows, given_up = picked(rows, ~lost), given_up + int(np.count_nonzero(lost))
            continue
        free = least.free
        now = at_times(stage, least.shift_s)
        new, pairs = coils.more(now, stage, rig, abilities)
        if len(new.least):
            opened = new.kind == SWITCH_ROW
            if opened.any():
                proven, parts = min(proven, least.bound), Parts()
                shut = shut_rows(pairs[len(pairs) - np.count_nonzero(opened) :], stage.tracks, events)
                new = joined([picked(new, ~opened), _cheaper(stage, rows, picked(new, opened), shut, free, budget)])
            rows = joined([rows, new])
            continue
        enough = no_air or plainly_enough(now, stage.moves_L, rig, abilities)
        spans, full_s = ([], full_s) if enough else overdrawn(now, rig, abilities)
        more = whole_rows(spans, now, events, least.shift_s, rig, abilities, air) if spans else no_rows(events)
        if not len(more.least):
            break
        rows = joined([rows, more])
    if least is None or len(least.dual) != len(rows.least):
        least = least_cost(events, rows, stage.terms, free, whole, budget)
    if least is None:
        return None
    return _Bottom(replace(least, bound=min(least.bound, proven)), rows, given_up, no_air, spans, full_s, tuple(hopeless))


def _at_once(tracks: Tracks, rig: Rig, abilities: Abilities) -> bool:
    """Whether moves that land together at once draw more than a full receiver bears; of all other moves nothing is asked."""
    at_once = np.isin(tracks.manner, (SUDDEN, STEP))
    if not at_once.any():
        return False
    alone = replace(tracks, manner=np.where(at_once, tracks.manner, HOLD), quivers=NONE)
    return len(too_much_at_once(alone, fills_of(alone, abilities), rig.supply, abilities)) > 0


def _cheaper(stage: Stage, rows: Rows, one: Rows, other: Rows, free: Flags, budget: Budget) -> Rows:
    """Of two sets of further rows the one that costs less."""
    costs = []
    for more in (one, other):
        least = least_cost(stage.events, joined([rows, more]), stage.terms, free, False, budget)
        costs.append(np.inf if least is None else least.cost)
    return other if costs[1] < costs[0] else one


def _closed_in(stage: Stage, rig: Rig, abilities: Abilities, bottom: _Bottom, budget: Budget) -> tuple[Found, bool] | None:
    """Times closed in on from the bottom by rows about the times of each round, and whether the checker finds them clean."""
    events, least = stage.events, bottom.least
    shares, parts = no_rows(events), Parts()
    for _ in range(AIR_ROUNDS):
        now = at_times(stage, least.shift_s)
        spans, _ = overdrawn(now, rig, abilities)
        if not spans:
            return Found(least, shares), not Coiled().more(now, stage, rig, abilities)[1]
        more = joined([shares, share_rows(spans, now, events, least.shift_s, rig, abilities)])
        found = least_cost(events, joined([bottom.rows, more]), stage.terms, least.free, False, budget, parts=parts)
        if found is None:
            parts = Parts()
            # Rows about earlier times may stand in one another's way. The latest alone are true to the times at hand; what
            # they ask beyond what can be is given at a price, so that the next round starts nearer.
            more = picked(more, np.arange((len(more.least) + 1) // 2, len(more.least)))
            found = least_cost(events, joined([bottom.rows, more]), stage.terms, least.free, False, budget, _price(stage))
        if found is None:
            return None
        least, shares = found, more
    return Found(least, shares), False


def _unkeepable(stage: Stage, rows: Rows, whole: bool, budget: Budget) -> Flags:
    """(M,) the rows beyond moves, holds, order and pins that stay broken at a high price, where they are what breaks."""
    least = least_cost(stage.events, rows, stage.terms, None, whole, budget, _price(stage))
    if least is None:
        return np.zeros(len(rows.least), dtype=bool)
    return (rows.kind >= ABOVE_ROW) & (rows.least - rows.matrix @ least.shift_s > GIVEN_UP_S)


def _hopeless(stage: Stage, rows: Rows, lost: Flags, whole: bool, budget: Budget) -> list[Hopeless]:
    """Those of the rows given up that would be given up without any pin too."""
    free = rows.kind != PIN_ROW
    if not free.all():
        without = np.zeros(len(free), dtype=bool)
        without[free] = _unkeepable(stage, picked(rows, free), whole, budget)
        lost = lost & without
    return list(zip(rows.kind[lost].tolist(), rows.knot[lost].tolist(), strict=True))


def _price(stage: Stage) -> float:
    """What a second of a row broken costs, in strokes: far more than what any row is worth in a programme that has times."""
    return 1e4 * max(1.0, float(stage.events.weight.max(initial=0.0)))
