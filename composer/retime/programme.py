"""The linear programme over some events and rows: made smaller, solved as a circulation, and told with its duals."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from composer.retime.flow import ENDLESS, Arcs, Budget, Circulation, Unsolved, Wide, between
from composer.retime.rows import ABOVE_ROW, HOLD_ROW, MOVE_ROW, Rows
from composer.retime.terms import Contracted

__all__ = ["Solved", "Unsolved", "solve"]

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]

LIGHTEST = 1e-9
"""What a term weighs at least, in strokes, so that an event whose moves go nowhere still stays where it is."""

SCALE = 1e3
"""HiGHS is given strokes times this, so that its tolerance on forces is small beside the tilt that breaks ties."""


@dataclass(frozen=True, slots=True, eq=False)
class Solved:
    """An optimum over n events and m rows: shift_s (n,) seconds; bound, the dual value; dual (m,) strokes a second of a row."""

    shift_s: Array
    bound: float
    dual: Array


@dataclass(frozen=True, slots=True, eq=False)
class _Starts:
    """S free starts that need no balance of their own, (S,) each, in numbers of the events solved for.

    start; before, hit: the event that the rest hangs from (-1: none) and the one that the move lands in
    rest, move: their rows; rest_s, move_s: least differences; weight: what a second costs; led: whether it is counted from
    its hit
    """

    start: Index
    before: Index
    hit: Index
    rest: Index
    move: Index
    rest_s: Array
    move_s: Array
    weight: Array
    led: Flags


class Programme:
    """A programme that stays in the solver: what is added is solved for from where it was. Numbers are those of the whole."""

    def __init__(self, rows: Rows, chosen: Index, events: Index, terms: Contracted, slack_price: float = np.inf):
        """As `solve` takes them."""
        self.events, self.chosen, self.price = events, chosen, slack_price
        self.wanted = _wanted(terms, rows.matrix.shape[1])
        n, m = len(events), len(chosen)
        number = np.full(rows.matrix.shape[1] + 1, -1, dtype=np.int64)
        number[events] = np.arange(n)
        at, behind = number[terms.event], number[terms.behind]
        weight = np.maximum(terms.weight, LIGHTEST) * SCALE
        matrix = sparse.csr_array(rows.matrix[chosen][:, events])
        least, kind = rows.least[chosen], rows.kind[chosen]

        row_later, row_earlier, plain = _pairs(matrix)
        gone, term_of = _starts(matrix, kind, row_later, row_earlier, least, at, behind, weight)
        kept_row = np.ones(m, dtype=bool)
        kept_row[gone.rest] = kept_row[gone.move] = False
        kept_row = np.flatnonzero(kept_row)
        kept_term = np.ones(len(at), dtype=bool)
        kept_term[term_of] = False
        kept_term = np.flatnonzero(kept_term)

        pair, other = kept_row[plain[kept_row]], kept_row[~plain[kept_row]]
        price = np.where((kind >= ABOVE_ROW) & np.isfinite(slack_price), min(slack_price, 1e300) * SCALE, np.inf)
        self.clock, self.led = ~gone.led, gone.led & (gone.move_s <= 0.0)
        clock, led = self.clock, self.led
        none, zero = np.full(len(gone.start), -1), np.zeros(len(gone.start))
        parts = [
            # The whole way from the rest's beginning to the hit.
            (gone.hit, gone.before, gone.rest_s + gone.move_s, zero, zero + np.inf),
            # By the clock: what it costs to be pushed later, and to leave earlier.
            (none[clock], gone.before[clock], gone.rest_s[clock], zero[clock], gone.weight[clock]),
            (gone.hit[clock], none[clock], gone.move_s[clock], zero[clock], gone.weight[clock]),
            # By its hit: what it costs to be pushed nearer; that it must leave earlier than written costs the same anywhere.
            (gone.hit[led], gone.before[led], gone.rest_s[led], zero[led], gone.weight[led]),
            (at[kept_term], behind[kept_term], np.zeros(len(kept_term)), -weight[kept_term], weight[kept_term]),
            (row_later[pair], row_earlier[pair], least[pair], np.zeros(len(pair)), price[pair]),
        ]
        nodes = np.ones(n, dtype=bool)
        nodes[gone.start] = False
        nodes = np.flatnonzero(nodes)
        name = np.full(n + 1, -1)
        name[nodes] = np.arange(len(nodes))
        later, earlier, *rest = (np.concatenate([part[k] for part in parts]) for k in range(5))
        arcs = Arcs(name[later], name[earlier], *rest)
        wide = Wide(sparse.csr_array(matrix[other][:, nodes]), least[other], price[other])
        self.circulation = Circulation(arcs, wide, len(nodes))
        self.back = np.zeros(len(gone.start), dtype=bool)
        self.sizes = np.cumsum([len(part[2]) for part in parts])
        self.pair_rows, self.other_rows = chosen[pair], chosen[other]
        # What was added: a row's number, -1 for a cost.
        self.added = np.empty(0, dtype=np.int64)
        self.nodes = events[nodes]
        whole = np.append(events, -1)
        self.gone = replace(
            gone, start=events[gone.start], before=whole[gone.before], hit=whole[gone.hit], rest=chosen[gone.rest],
            move=chosen[gone.move],
        )  # fmt: skip

    def grow(self, rows: Rows, chosen: Index, events: Index, terms: Contracted) -> bool:
        """Add what is new to the programme in the solver; False where something that was given has gone."""
        new_rows = np.setdiff1d(chosen, self.chosen, assume_unique=True)
        new_events = np.setdiff1d(events, self.events, assume_unique=True)
        if len(chosen) - len(new_rows) != len(self.chosen) or len(events) - len(new_events) != len(self.events):
            return False
        count = rows.matrix.shape[1]
        wanted = _wanted(terms, count)
        if not np.array_equal(wanted[:, self.events], self.wanted[:, self.events]):
            return False
        part = rows.matrix[new_rows]
        # Starts that needed no balance of their own do once a row speaks of them.
        spoken = np.zeros(count, dtype=bool)
        spoken[part.indices] = True
        back = np.flatnonzero(spoken[self.gone.start] & ~self.back)
        starts = self.gone.start[back]
        self._close(back)
        self.nodes = np.concatenate((self.nodes, starts, new_events))
        priced = np.concatenate((starts, new_events[wanted[2, new_events] > 0.0]))
        again = np.concatenate((self.gone.rest[back], self.gone.move[back], new_rows))
        name = np.full(count + 1, -1)
        name[self.nodes] = np.arange(len(self.nodes))
        costs = between(name[priced], name[wanted[0, priced].astype(np.int64)], len(self.nodes))
        matrix = sparse.vstack([costs, sparse.csr_array(rows.matrix[again][:, self.nodes])], format="csr")
        weight, none = np.maximum(wanted[1, priced], LIGHTEST) * SCALE, np.zeros(len(again))
        price = np.full(len(again), np.inf)
        if np.isfinite(self.price):
            price[rows.kind[again] >= ABOVE_ROW] = self.price * SCALE
        self.circulation.add(
            len(starts) + len(new_events), matrix, np.concatenate((np.zeros(len(priced)), rows.least[again])),
            np.concatenate((-weight, none)), np.concatenate((weight, price)),
        )  # fmt: skip
        self.added = np.concatenate((self.added, np.full(len(priced), -1), again))
        self.events, self.chosen, self.wanted = events, chosen, wanted
        return True

    def _close(self, back: Index) -> None:
        """Take out what starts cost that get a balance of their own; the way through their rest and move stays true."""
        self.back[back] = True
        rank_clock, rank_led = np.cumsum(self.clock) - 1, np.cumsum(self.led) - 1
        clock, led = back[self.clock[back]], back[self.led[back]]
        arcs = [self.sizes[0] + rank_clock[clock], self.sizes[1] + rank_clock[clock], self.sizes[2] + rank_led[led]]
        if len(back):
            self.circulation.close(np.concatenate(arcs))

    def solve(self, rows: Rows, budget: Budget = ENDLESS) -> Solved | None:
        """The least cost, None where no shifts keep the rows. Raises Unsolved where HiGHS fails or runs past its budget."""
        found = self.circulation.solve(budget)
        if found is None:
            return None
        force, beyond, at_nodes = found
        gone, clock, led = self.gone, self.clock, self.led
        shift = np.zeros(rows.matrix.shape[1] + 1)
        shift[self.nodes] = at_nodes
        low, high = shift[gone.before] + gone.rest_s, shift[gone.hit] - gone.move_s
        own = np.maximum(np.minimum(np.where(gone.led, shift[gone.hit], 0.0), high), low)
        shift[gone.start[~self.back]] = own[~self.back]

        through, later, earlier, nearer, _, own = np.split(force, self.sizes[:-1])
        dual = np.zeros(len(rows.least))
        dual[self.pair_rows], dual[self.other_rows] = own, beyond[: len(self.other_rows)]
        is_row = self.added >= 0
        dual[gone.rest] = dual[gone.move] = through
        np.add.at(dual, self.added[is_row], beyond[len(self.other_rows) :][is_row])
        dual[gone.rest[clock]] += later
        dual[gone.move[clock]] += earlier
        dual[gone.rest[led]] += nearer
        must = gone.led & ~led & ~self.back
        dual[gone.move[must]] += gone.weight[must]
        dual = np.maximum(dual[self.chosen], 0.0) / SCALE
        return Solved(shift[self.events], float(dual @ rows.least[self.chosen]), dual)


def solve(
    rows: Rows, chosen: Index, events: Index, terms: Contracted, budget: Budget = ENDLESS, slack_price: float = np.inf
) -> Solved | None:
    """The least cost over `events` (n,) subject to the rows `chosen` (m,), which name no other event; None where none fits.

    slack_price: finite: what a second costs by which a row that speaks of more than two events is broken, in strokes
    Raises Unsolved where HiGHS fails or runs past its budget.
    """
    return Programme(rows, chosen, events, terms, slack_price).solve(rows, budget)


def _wanted(terms: Contracted, count: int) -> Array:
    """(3, N) of each event whose shift a term prices: what it is counted from (-1: nothing), its weight, and 1."""
    wanted = np.zeros((3, count))
    wanted[0, terms.event], wanted[1, terms.event], wanted[2, terms.event] = terms.behind, terms.weight, 1.0
    return wanted


def _pairs(matrix: sparse.csr_array) -> tuple[Index, Index, Flags]:
    """(m,) later and earlier event of each row, -1 for none, and whether it is a plain difference of two."""
    m = matrix.shape[0]
    row = np.repeat(np.arange(m), np.diff(matrix.indptr))
    up = matrix.data > 0.0
    later, earlier = np.full(m, -1), np.full(m, -1)
    later[row[up]], earlier[row[~up]] = matrix.indices[up], matrix.indices[~up]
    even = np.bincount(row, weights=np.abs(matrix.data) != 1.0, minlength=m) == 0.0
    return later, earlier, even & (np.bincount(row[up], minlength=m) <= 1) & (np.bincount(row[~up], minlength=m) <= 1)


def _starts(
    matrix: sparse.csr_array,
    kind: NDArray[np.int8],
    later: Index,
    earlier: Index,
    least: Array,
    at: Index,
    behind: Index,
    weight: Array,
) -> tuple[_Starts, Index]:
    """The starts of which only a rest, a move and one term speak, and the number of each one's term, (S,)."""
    n = matrix.shape[1]
    row = np.repeat(np.arange(matrix.shape[0]), np.diff(matrix.indptr))
    begins = (kind[row] == HOLD_ROW) & (matrix.data > 0.0)
    leaves = (kind[row] == MOVE_ROW) & (matrix.data < 0.0)
    rest, move, term = np.full(n, -1), np.full(n, -1), np.full(n, -1)
    rest[matrix.indices[begins]] = row[begins]
    move[matrix.indices[leaves]] = row[leaves]
    term[at] = np.arange(len(at))
    spoken = np.bincount(matrix.indices, minlength=n)
    sole = (rest >= 0) & (move >= 0) & (spoken == 2) & (np.bincount(at, minlength=n) == 1)
    sole &= np.bincount(behind[behind >= 0], minlength=n) == 0
    ahead, before = np.full(n, -1), np.full(n, -1)
    ahead[sole], before[sole] = later[move[sole]], earlier[rest[sole]]
    own = np.where(term >= 0, behind[term], -1)
    sole &= (ahead >= 0) & ((own == -1) | (own == ahead))
    # Two starts in a row, with no landing between them, both stay.
    sole &= ~np.append(sole, False)[ahead] & ~np.append(sole, False)[before]
    start = np.flatnonzero(sole)
    return _Starts(
        start, before[start], ahead[start], rest[start], move[start], least[rest[start]], least[move[start]],
        weight[term[start]], own[start] >= 0,
    ), term[start]  # fmt: skip
