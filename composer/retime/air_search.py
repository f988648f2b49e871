"""Where air is short: cheaper times that the receiver bears, looked for from several beginnings.

Demand is no convex function of times, so what is found is the best near each beginning: successive linear programming with
an exact penalty in a box that grows and shrinks with how far it can be trusted (Fletcher and Sainz de la Maza 1989). Most
of what keeps a search from the best is the order in which fills follow one another, so from the best that is known some
moves are thrown elsewhere and the search begins again (iterated local search: Lourenço, Martin and Stützle 2003). Random
numbers are always the same ones.
"""

from dataclasses import dataclass, replace
from itertools import zip_longest

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from composer.limits.abilities import Abilities
from composer.limits.air import refill_L_s, store_L
from composer.retime.air_account import HAIR_S, Account, account_of
from composer.retime.air_cuts import Span, overdraft_L
from composer.retime.cuts import Coiled
from composer.retime.flow import Budget, Unsolved
from composer.retime.local import Least, inside
from composer.retime.resident import Resident
from composer.retime.rows import AIR_ROW, Rows, joined, no_rows
from composer.retime.stage import Stage, at_times
from composer.retime.terms import contract, cost, spread
from composer.rig.model import Rig
from composer.tracks import HOLD, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]

STEPS, RAISES, CLEAN, CLEANED = 60, 4, 10, 3
"""Steps of one descent and prices that it tries, rounds that make its answer clean, and how many answers are made so."""

FINER = 64
"""Straight pieces a curved fill is laid out as while an answer is made clean."""

BLOCKS = 0.3
"""How many of the throws move all that lies in some stretch of time by the same."""

PAID, NEARLY = 1e-7, 1e-4
"""Shares of the store that may be overdrawn: where a price is high enough, and in what cleaning still mends."""

SAME_S = 1e-3
"""Times that differ by no more are the same answer, before they are made clean."""

AGAIN, AT_LEAST = 12, 36
"""An answer that so many beginnings end at is taken to be the best there is, once so many at least were tried."""

ENOUGH, SMALLEST_S = 1e-7, 3e-6
"""A step that promises less (relative), or a box smaller than that, is the last."""

ALL_FROM = 300
"""Scores of no more events than this are searched with all of them free to move."""

BEGINNINGS = ((40, 60), (100, 30), (300, 12), (1200, 4), (6000, 1))
"""How many beginnings are tried where no more than so many events may move; none above."""


@dataclass(frozen=True, slots=True, eq=False)
class Found:
    """Times that keep every row and every span, with the rows about them."""

    least: Least
    shares: Rows


def better(
    stage: Stage,
    rig: Rig,
    abilities: Abilities,
    rows: Rows,
    bottom: Least,
    spans: list[Span],
    best: Found | None,
    budget: Budget,
) -> tuple[Found | None, bool]:
    """The cheapest of what is found from several beginnings and `best`, None where nothing is.

    bottom: the optimum of the rows that are true for all times, which ask too little; spans: those that it overdraws
    Returns as well whether time was up before all were tried.
    """
    count = len(stage.events.written_s)
    free = (
        np.ones(count, dtype=bool)
        if count <= ALL_FROM
        else _about(stage, bottom, spans, store_L(rig.supply) / refill_L_s(rig.supply))
    )
    tries = next((tries for most, tries in BEGINNINGS if np.count_nonzero(free) <= most), 0)
    if not tries:
        return best, False
    try:
        search = Search(stage, rig, abilities, rows, bottom, free, budget)
        return search.best(tries, best), False
    except Unsolved:
        return best, True


def _about(stage: Stage, bottom: Least, spans: list[Span], reach_s: float) -> Flags:
    """The events that the optimum moves, and those about the spans that it overdraws."""
    events, behind = stage.events, stage.terms.behind
    free, at = bottom.free.copy(), events.written_s + bottom.shift_s
    for from_s, to_s in spans:
        free |= (at >= from_s - reach_s) & (at <= to_s + reach_s)
    following = free[events.hits :] & (behind[events.hits :] >= 0)
    free[events.own_hit[events.hits :][following]] = True
    return free


def _distinct(ranked: list[tuple[float, Array]]) -> list[tuple[float, Array]]:
    """The cheapest few of some times by their costs that are not the same as another."""
    few: list[tuple[float, Array]] = []
    for worth, x in ranked:
        if len(few) < CLEANED and all(np.abs(x - other).max() > SAME_S for _, other in few):
            few.append((worth, x))
    return few


class Search:
    """One programme in the solver, one account of the air, and the descents made with both."""

    def __init__(
        self,
        stage: Stage,
        rig: Rig,
        abilities: Abilities,
        rows: Rows,
        bottom: Least,
        free: Flags,
        budget: Budget,
        window: tuple[float, float] | None = None,
    ):
        """Over the events `free` (N,). All others go where it costs least; in a window, they stay where `bottom` has them."""
        self.stage, self.rig, self.abilities, self.bottom, self.window = stage, rig, abilities, bottom, window
        self.mask, self.free = free, np.flatnonzero(free)
        self.still = np.where(free, 0.0, bottom.shift_s) if window is not None else np.zeros(len(free))
        self.standing = cost(stage.terms, self.still)
        self.account: Account = account_of(stage, self.tracks(bottom.shift_s), rig, abilities, self.free)
        self.left = contract(stage.events, stage.terms, free)
        self.plain_price = self.price = 2.0 * max(1.0, float(stage.events.weight[free].sum()))
        self.rng = np.random.default_rng(1)
        self.budget, self.plain = budget, rows
        self.keep(rows)

    def keep(self, rows: Rows) -> None:
        """Search among the times that keep these rows."""
        self.rows = rows
        if self.window is None:
            self.chosen = inside(rows, self.mask)
        else:
            named = np.repeat(np.arange(len(rows.least)), np.diff(rows.matrix.indptr))
            self.chosen = np.unique(named[self.mask[rows.matrix.indices]])
            rows = replace(rows, least=rows.least - rows.matrix @ self.still)
        self.programme = Resident(rows, self.chosen, self.free, self.left, self.price, self.budget)

    def tracks(self, full: Array) -> Tracks:
        """The tracks with their events displaced; outside the window nothing moves, and so nothing is drawn."""
        now = at_times(self.stage, full)
        if self.window is None or len(now.quivers):
            return now
        ends = np.append(now.time_s[1:], np.inf)
        here = (now.time_s < self.window[1]) & (ends > self.window[0])
        return replace(now, manner=np.where(here, now.manner, HOLD).astype(np.int8))

    def whole(self, shift_s: Array) -> Array:
        """(N,) shifts of all events from those of the free ones."""
        full = self.still.copy()
        full[self.free] = shift_s
        return spread(self.stage.events, self.stage.terms, self.mask, self.left, full) if self.window is None else full

    def merit(self, full: Array) -> float:
        """Cost, with a price on what is overdrawn."""
        return cost(self.stage.terms, full) + self.price * self.account.overdraft_s(full)

    def best(self, tries: int, best: Found | None) -> Found | None:
        """The cheapest clean answer from so many beginnings, or the one given, if that is cheaper."""
        ranked: list[tuple[float, Array]] = []
        for number, start in enumerate(self.beginnings(best, tries, ranked)):
            self.budget.say(f"air: beginning {number + 1} of {tries}")
            there = self.descend(start, alone=tries == 1)
            if there is not None:
                ranked.append(there)
                ranked.sort(key=lambda one: one[0])
                least = ranked[0][0] * (1.0 + 1e-6)
                if least <= self.bottom.cost * (1.0 + 2e-6) or (
                    number >= AT_LEAST and sum(worth <= least for worth, _ in ranked) >= AGAIN
                ):
                    break
        for worth, x in _distinct(ranked):
            if best is not None and worth >= best.least.cost * (1.0 - 1e-9):
                break
            found = self.cleaned(x)
            if found is not None and (best is None or found.least.cost < best.least.cost * (1.0 - 1e-9)):
                best = found
        return best

    def descend(self, start: Array, alone: bool = False) -> tuple[float, Array] | None:
        """Cost and times, (N,), at the end of the descent from some (n,); None where the receiver does not bear them.

        alone: whether no other is to be ranked beside it, so that what little is overdrawn can be left to its cleaning
        """
        x = self.programme.nearest(start)
        if x is None:
            return None
        lasts = self.account.store / self.account.refill
        full = self._priced(self.whole(x), 0.25 * lasts + 0.1, NEARLY if alone else PAID)
        return (cost(self.stage.terms, full), full) if self.account.overdraft_s(full) <= NEARLY * lasts else None

    def _priced(self, full: Array, box: float, most: float = PAID) -> Array:
        """A descent whose price on overdrawing is raised until no more than such a share of the store is overdrawn."""
        for number in range(RAISES):
            self.price = self.plain_price * 10.0**number
            self.programme.reprice(self.price)
            full = self._descended(full, box)
            if self.account.overdraft_s(full) <= most * self.account.store / self.account.refill:
                break
            box *= 0.2
        return full

    def _descended(self, full: Array, box: float) -> Array:
        """Times from which no step within a small box lessens cost and price together, from some that keep the rows."""
        x, columns = full[self.free], len(self.mask)
        merit = self.merit(full)
        for _ in range(STEPS):
            hair = HAIR_S * self.rng.random(columns)
            matrix, least = self.account.rows(full + hair)
            step = self.programme.least(matrix, least, x - box, x + box)
            if step is None:
                box *= 0.5
                continue
            y, worth, over = step
            worth += self.standing
            promised = merit - worth - self.price * over
            if promised <= ENOUGH * max(1.0, abs(worth)) and box < 0.01:
                break
            there = self.whole(y)
            then = self.merit(there)
            if then < merit - 0.1 * max(promised, 0.0):
                if then < merit - 0.7 * promised:
                    box *= 2.0
                x, full, merit = y, there, then
            else:
                box *= 0.35
            if box < SMALLEST_S:
                break
        return full

    def cleaned(self, full: Array) -> Found | None:
        """The best near some times with which the checker finds nothing, and the rows and forces that hold it there."""
        events = self.stage.events
        self.keep(self.plain)
        coils = Coiled()
        hot = no_rows(events)
        kept, box = store_L(self.rig.supply), 0.02 * self.account.store / self.account.refill
        for _ in range(CLEAN):
            self.account = replace(
                account_of(self.stage, self.tracks(full), self.rig, self.abilities, self.free, FINER), store=kept
            )
            full = self._priced(full, box)
            lacks = overdraft_L(self.tracks(full), self.rig, self.abilities)
            # In a window coils are left to whoever looks at the whole.
            whole = self.window is None
            now = at_times(self.stage, full)
            more, spans = coils.more(now, self.stage, self.rig, self.abilities) if whole else (no_rows(events), [])
            if lacks <= 0.0 and not spans:
                break
            if lacks > 0.0:
                kept -= lacks * 1.1 + 1e-8 * self.account.store
            if spans:
                hot = joined([hot, more])
                self.keep(joined([self.plain, hot]))
        else:
            return None
        return self._held(full, hot, box)

    def _held(self, full: Array, hot: Rows, box: float) -> Found:
        """Times that are clean, with the rows and forces that hold them there."""
        matrix, least = self.account.rows(full)
        x = full[self.free]
        self.programme.least(matrix, least, x - box, x + box)
        stay, pass_ = self.programme.forces()
        count = len(least)
        row, column = np.nonzero(matrix)
        wide = sparse.csr_array((matrix[row, column], (row, self.free[column])), shape=(count, len(self.mask)))
        air = Rows(wide, least, np.full(count, AIR_ROW, dtype=np.int8), np.full(count, -1, dtype=np.int64))
        dual = np.zeros(len(self.rows.least))
        dual[self.chosen] = stay
        there = Least(full, cost(self.stage.terms, full), self.bottom.bound, np.concatenate((dual, pass_)), self.mask)
        return Found(there, joined([hot, air]))

    def beginnings(self, best: Found | None, tries: int, ranked: list[tuple[float, Array]]):
        """The optimum that asks too little, the best known, all moves left early; then the best so far with some thrown."""
        events = self.stage.events
        yield self.bottom.shift_s[self.free]
        if best is not None:
            yield best.least.shift_s[self.free]
        starts = np.arange(events.hits, len(events.written_s))
        self.earliest = self.bottom.shift_s.copy()
        before = events.event[np.flatnonzero(events.free) - 1]
        landed = np.where(before < 0, 0.0, np.append(events.written_s + self.bottom.shift_s, 0.0)[before])
        self.earliest[starts] = landed - events.written_s[starts]
        if tries > 3:
            yield self.earliest[self.free]
        reach = self.account.store / self.account.refill
        alone = self._alone()[: 2 * tries // 3]
        for number in range(tries - 3):
            few = _distinct(ranked)
            # From one of the best, or from the optimum that asks too little, which still has every choice open.
            some = [x for _, x in few] + [self.bottom.shift_s]
            if number < len(alone):
                event, to, share = alone[number]
                thrown = some[-1 if event < events.hits else 0].copy()
                thrown[event] += share * (to - thrown[event])
            else:
                thrown = self.thrown(some[int(self.rng.integers(0, len(some)))], reach)
            yield thrown[self.free]

    def _alone(self) -> list[tuple[int, float, float]]:
        """Throws of one event each, hits to the next and starts to their earliest: event, shift to go to, share of the way."""
        account, events, bottom = self.account, self.stage.events, self.bottom.shift_s
        starts = np.unique(account.start[account.start >= events.hits])
        starts = starts[self.earliest[starts] < bottom[starts]].tolist()
        landing = np.unique(account.end[(account.end >= 0) & (account.end < events.hits - 1)]).tolist()
        at = events.written_s + bottom
        of_hits = [(hit, float(at[hit + 1] - events.written_s[hit]), 1.0) for hit in landing]
        of_starts = [(start, float(self.earliest[start]), share) for share in (1.0, 0.5) for start in starts]
        return [one for pair in zip_longest(of_starts, of_hits) for one in pair if one is not None]

    def thrown(self, here: Array, reach: float) -> Array:
        """Times with some fills moved to begin or to land elsewhere."""
        account, events, rng = self.account, self.stage.events, self.rng
        thrown, fills = here.copy(), len(account.start)
        if rng.random() < BLOCKS:
            # All that lies between two instants together, later or earlier; half of the time what follows as well.
            low, high = np.sort(rng.choice(events.written_s[self.free], 2))
            block = (events.written_s >= low) & (events.written_s <= (high if rng.random() < 0.5 else np.inf))
            thrown[block] += rng.normal() * reach * 10.0 ** rng.uniform(-1.0, 0.3)
            return thrown
        for fill in rng.choice(fills, min(int(rng.integers(1, 5)), fills), replace=False):
            start, end = int(account.start[fill]), int(account.end[fill])
            by = rng.normal() * 10.0 ** rng.uniform(-1.5, 0.0) * reach
            how = int(rng.integers(0, 7))
            if how in (0, 2) and start >= 0:
                thrown[start] += by
            if how in (1, 2) and end >= 0:
                thrown[end] += by
            if how >= 3 and start >= events.hits:
                # At the very beginning of the rest before it, at its very end, or anywhere between.
                earliest, latest = self.earliest[start], thrown[end] + events.written_s[end] - events.written_s[start]
                share = (0.0, 0.0, 1.0, rng.random())[how - 3]
                thrown[start] = earliest + share * max(latest - earliest, 0.0)
        return thrown
