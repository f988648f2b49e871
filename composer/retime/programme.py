"""The linear programme over some events and rows: made smaller, solved as a circulation, and told with its duals."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from composer.retime.flow import ENDLESS, Arcs, Budget, Unsolved, Wide, circulate
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


def solve(
    rows: Rows, chosen: Index, events: Index, terms: Contracted, budget: Budget = ENDLESS, slack_price: float = np.inf
) -> Solved | None:
    """The least cost over `events` (n,) subject to the rows `chosen` (m,), which name no other event; None where none fits.

    slack_price: finite: what a second costs by which a row that speaks of more than two events is broken, in strokes
    Raises Unsolved where HiGHS fails or runs past its budget.
    """
    n, m = len(events), len(chosen)
    number = np.full(rows.matrix.shape[1], -1, dtype=np.int64)
    number[events] = np.arange(n)
    at, behind = number[terms.event], np.where(terms.behind >= 0, number[terms.behind], -1)
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
    clock, led = ~gone.led, gone.led & (gone.move_s <= 0.0)
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
    found = circulate(arcs, Wide(sparse.csr_array(matrix[other][:, nodes]), least[other], price[other]), len(nodes), budget)
    if found is None:
        return None
    force, wide, at_nodes = found
    shift = np.zeros(n)
    shift[nodes] = at_nodes
    padded = np.append(shift, 0.0)
    low, high = padded[gone.before] + gone.rest_s, padded[gone.hit] - gone.move_s
    shift[gone.start] = np.maximum(np.minimum(np.where(gone.led, padded[gone.hit], 0.0), high), low)

    through, later, earlier, nearer, _, own = np.split(force, np.cumsum([len(part[2]) for part in parts])[:-1])
    dual = np.zeros(m)
    dual[pair], dual[other] = own, wide
    dual[gone.rest] = dual[gone.move] = through
    dual[gone.rest[clock]] += later
    dual[gone.move[clock]] += earlier
    dual[gone.rest[led]] += nearer
    must = gone.led & ~led
    dual[gone.move[must]] += gone.weight[must]
    dual = np.maximum(dual, 0.0) / SCALE
    return Solved(shift, float(dual @ least), dual)


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
