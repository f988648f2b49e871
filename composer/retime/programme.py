"""The linear programme over some events and rows, solved by HiGHS (Huangfu and Hall 2018) through scipy, with its duals."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse
from scipy.optimize import linprog

from composer.retime.rows import ABOVE_ROW, Rows
from composer.retime.terms import Contracted

Array = NDArray[np.float64]
Index = NDArray[np.int64]

TOLERANCE = 1e-10
"""Feasibility of HiGHS, primal (s) and dual (strokes); the tightest that it takes."""

LIGHTEST = 1e-9
"""What a term weighs at least, in strokes, so that an event whose moves go nowhere still stays where it is."""


SCALE = 1e3
"""HiGHS is given strokes times this, so that its tolerance on duals is small beside the tilt that breaks ties."""


class Unsolved(Exception):
    """The solver gave up; `status` and `message` are its own."""

    def __init__(self, status: int, message: str):
        self.status = status
        super().__init__(message)


@dataclass(frozen=True, slots=True, eq=False)
class Solved:
    """An optimum over n events and m rows: shift_s (n,) seconds; bound, the dual value; dual (m,) strokes a second of a row."""

    shift_s: Array
    bound: float
    dual: Array


def solve(
    rows: Rows, chosen: Index, events: Index, terms: Contracted, limit_s: float = np.inf, slack_price: float = np.inf
) -> Solved | None:
    """The least cost over `events` (n,) subject to the rows `chosen` (m,), which name no other event; None where none fits.

    slack_price: finite: what a second costs by which a row that speaks of more than two events is broken, in strokes
    Raises Unsolved where HiGHS fails or runs past `limit_s`.
    """
    n = len(events)
    number = np.full(rows.matrix.shape[1], -1, dtype=np.int64)
    number[events] = np.arange(n)
    at, behind = number[terms.event], np.where(terms.behind >= 0, number[terms.behind], -1)
    weight = np.maximum(terms.weight, LIGHTEST)

    # An event with one term of its own alone is a difference of two columns; all others are free, each term two columns
    # and a row that says what they are.
    linked = np.zeros(n, dtype=bool)
    pair = behind >= 0
    linked[at[pair]] = linked[behind[pair]] = True
    linked |= np.bincount(at, minlength=n) != 1
    own = ~linked[at]
    loose = np.flatnonzero(linked)
    simple, tied = np.flatnonzero(own), np.flatnonzero(~own)
    s, t = len(simple), len(tied)
    width = len(loose) + 2 * s + 2 * t
    up = len(loose) + np.arange(s)
    as_columns = sparse.csr_array(
        (
            np.concatenate((np.ones(len(loose)), np.ones(s), -np.ones(s))),
            (np.concatenate((loose, at[simple], at[simple])), np.concatenate((np.arange(len(loose)), up, up + s))),
        ),
        shape=(n, width),
    )
    weight = weight * SCALE
    price = np.zeros(width)
    price[len(loose) :] = np.concatenate((weight[simple], weight[simple], weight[tied], weight[tied]))
    lower = np.zeros(width)
    lower[: len(loose)] = -np.inf

    above = rows.matrix[chosen][:, events] @ as_columns
    ties = None
    if t:
        first = len(loose) + 2 * s
        line = np.arange(t)
        apart = sparse.csr_array((-np.ones(t), (line, first + line)), shape=(t, width))
        apart = apart + sparse.csr_array((np.ones(t), (line, first + t + line)), shape=(t, width))
        place = sparse.csr_array((np.ones(t), (line, at[tied])), shape=(t, n))
        has = np.flatnonzero(behind[tied] >= 0)
        place = place - sparse.csr_array((np.ones(len(has)), (has, behind[tied][has])), shape=(t, n))
        ties = sparse.csr_array(place @ as_columns + apart)

    soft = np.flatnonzero(rows.kind[chosen] >= ABOVE_ROW) if np.isfinite(slack_price) else np.empty(0, dtype=np.int64)
    if len(soft):
        give = sparse.csr_array((np.ones(len(soft)), (soft, np.arange(len(soft)))), shape=(len(chosen), len(soft)))
        above = sparse.hstack([above, give], format="csr")
        price, lower = np.append(price, np.full(len(soft), slack_price * SCALE)), np.append(lower, np.zeros(len(soft)))
        as_columns = sparse.hstack([as_columns, sparse.csr_array((n, len(soft)))], format="csr")
        ties = None if ties is None else sparse.hstack([ties, sparse.csr_array((t, len(soft)))], format="csr")

    options = {"primal_feasibility_tolerance": TOLERANCE, "dual_feasibility_tolerance": TOLERANCE}
    if np.isfinite(limit_s):
        options["time_limit"] = max(limit_s, 1e-3)
    found = linprog(
        price,
        A_ub=-above if len(chosen) else None,
        b_ub=-rows.least[chosen] if len(chosen) else None,
        A_eq=ties,
        b_eq=None if ties is None else np.zeros(t),
        bounds=np.column_stack((lower, np.full(len(lower), np.inf))),
        method="highs-ds",
        options=options,
    )
    if found.status == 2:
        return None
    if found.status != 0:
        raise Unsolved(found.status, found.message)
    dual = np.maximum(-found.ineqlin.marginals, 0.0) / SCALE if len(chosen) else np.empty(0)
    return Solved(as_columns @ found.x, float(dual @ rows.least[chosen]), dual)
