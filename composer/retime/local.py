"""Solving only where something must move: a programme round the snags, grown until nothing outside it is broken.

What is solved is the whole programme less the rows that it leaves out, so its value is a lower bound on the whole at
every step; once no row left out is broken, the solution joined with all that stands still is the optimum of the whole,
and the rows' dual values, none on a row left out, prove it.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.retime.events import Events
from composer.retime.flow import ENDLESS, Budget
from composer.retime.parts import Parts
from composer.retime.pushed import pushed
from composer.retime.reach import reached
from composer.retime.rows import Rows
from composer.retime.terms import Terms, contract, cost, spread, tilted

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

BROKEN_S = 1e-10
"""A row short by no more than this is kept; the polish makes it exact."""

WHOLE_FROM = 0.6
"""Once this share of all events is in it, growing the programme further costs more than solving the whole."""

WIDE = 16
"""Where more starts than so many hang from each hit, as in a large ensemble, all of it is solved as fast as a part is found."""


@dataclass(frozen=True, slots=True, eq=False)
class Least:
    """A retiming of least cost: shift_s (N,); cost and bound in stroke-seconds; dual (M,) of each row; free (N,) as grown."""

    shift_s: Array
    cost: float
    bound: float
    dual: Array
    free: Flags


def least_cost(
    events: Events,
    rows: Rows,
    terms: Terms,
    free: Flags | None = None,
    whole: bool = False,
    budget: Budget = ENDLESS,
    slack_price: float = np.inf,
    parts: Parts | None = None,
) -> Least | None:
    """The least-cost shifts of all events, or None where no times satisfy the rows.

    free: events to begin with, from an earlier solution; whole: solve the whole at once instead of growing
    slack_price: what a second costs by which a row beyond the plain differences is broken, in strokes
    parts: what is kept of the last solution of these rows less some at their end
    """
    parts = Parts() if parts is None else parts
    count = len(events.written_s)
    free = np.zeros(count, dtype=bool) if free is None else free.copy()
    free |= whole
    shift, bound, dual = np.zeros(count), 0.0, np.zeros(len(rows.least))
    order = np.argsort(events.written_s, kind="stable")
    solved = not free.any()
    by_rhythm = bool((terms.behind[: events.hits] >= 0).any())
    priced, most = tilted(events, terms)
    if solved and np.isinf(slack_price) and (there := pushed(events, rows, priced)) is not None:
        shift, dual = there
        return Least(shift, cost(terms, shift), float(dual @ rows.least) / most, dual, shift != 0.0)
    while True:
        lack = rows.least - rows.matrix @ shift
        broken = np.flatnonzero(lack > BROKEN_S)
        grown = free.copy()
        grown[rows.matrix[broken].indices] = True
        if solved and (not len(broken) or (grown == free).all()):
            return Least(shift, cost(terms, shift), bound, dual, free)
        if count > WIDE * max(events.hits, 1):
            grown[:] = True
        elif not free.any() and not by_rhythm:
            grown |= reached(events, rows, broken)
        free = grown | _near(events, order, rows, broken, lack, _own_shift(terms, shift))
        if np.count_nonzero(free) > WHOLE_FROM * count:
            free[:] = True
        following = free[events.hits :] & (terms.behind[events.hits :] >= 0)
        free[events.own_hit[events.hits :][following]] = True
        chosen = inside(rows, free)
        left = contract(events, priced, free)
        found = parts.solve(rows, chosen, np.flatnonzero(free), left, budget, slack_price)
        if found is None:
            return None
        shift = np.zeros(count)
        shift[free] = found.shift_s
        shift = spread(events, priced, free, left, shift)
        # Divided by the tilt, the dual values satisfy the programme without it.
        bound, solved = found.bound / most, True
        dual = np.zeros(len(rows.least))
        dual[chosen] = found.dual


def _own_shift(terms: Terms, shift: Array) -> Array:
    """How far each event is from where its own term wants it, (N,)."""
    padded = np.append(shift, 0.0)
    return shift - padded[terms.behind]


def inside(rows: Rows, free: Flags) -> NDArray[np.int64]:
    """The rows all of whose events are free."""
    row = np.repeat(np.arange(len(rows.least)), np.diff(rows.matrix.indptr))
    outside = np.bincount(row[~free[rows.matrix.indices]], minlength=len(rows.least))
    return np.flatnonzero(outside == 0)


def _near(events: Events, order: NDArray[np.int64], rows: Rows, broken: Array, lack: Array, own: Array) -> Flags:
    """The events that are likely to be met: those in the time that a moved one passes, or that a broken row asks for.

    Only a guess at what the next round would ask for, which saves rounds: any guess ends at the same optimum.
    """
    moved = np.flatnonzero(np.abs(own) > BROKEN_S)
    part = rows.matrix[broken]
    row = np.repeat(broken, np.diff(part.indptr))
    reach = np.where(part.data > 0.0, lack[row], -lack[row])
    at = np.concatenate((events.written_s[moved], events.written_s[part.indices]))
    to = at + np.concatenate((own[moved], reach))
    ranked = events.written_s[order]
    low = np.searchsorted(ranked, np.minimum(at, to), side="left")
    high = np.searchsorted(ranked, np.maximum(at, to), side="right")
    edge = np.bincount(low, minlength=len(order) + 1) - np.bincount(high, minlength=len(order) + 1)
    near = np.zeros(len(order), dtype=bool)
    near[order] = np.cumsum(edge[:-1]) > 0
    return near
