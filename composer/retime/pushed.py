"""Where it is best that all that is too fast only pushes what follows: one pass forward in time, and its proof.

The least displacements that keep all rows between two events are longest paths (Bellman 1958). Each moved event hangs from
one row that pushes it; the forces that follow along these rows are dual values if what stands still bears all that pushes
against it. Then the pass is the optimum, and the only one: so it is where one fiber's path is too fast from the start on.
"""

import numpy as np
from numpy.typing import NDArray

from composer.retime.events import Events
from composer.retime.reach import pairs, simple_rows
from composer.retime.rows import Rows
from composer.retime.terms import Terms

Array = NDArray[np.float64]
Index = NDArray[np.int64]

MOST = 5000
"""Events of a score that a pass is tried for; more are solved round their snags as fast."""

BROKEN_S = 1e-10
"""A row short by no more than this is kept."""

LIGHTEST = 1e-9
"""What an event weighs at least, in strokes."""


def pushed(events: Events, rows: Rows, terms: Terms) -> tuple[Array, Array] | None:
    """Shifts (N,) and dual values (M,) of the optimum where a pass forward finds and proves it; else None.

    terms: each event's own, as `all_terms` makes them, ties broken. Only where all keep the clock.
    """
    count = len(events.written_s)
    if not 0 < count <= MOST or (terms.behind >= 0).any():
        return None
    weight = np.maximum(terms.weight, LIGHTEST)
    simple = simple_rows(rows)
    later, earlier, least = pairs(rows, simple)
    order = np.argsort(np.append(events.place, -1)[later], kind="stable")
    broken = np.flatnonzero(least[order] > BROKEN_S)
    if not len(broken):
        return None
    first = order[broken[0]]
    # Nothing before the first broken row has moved. What weighs less than what it would push gives way itself.
    if earlier[first] >= 0 and weight[earlier[first]] <= weight[later[first]]:
        return None
    shift, by = _forward(count, later, earlier, least, order[broken[0] :])
    dual = _forces(events, weight, earlier, by)
    full = np.array(shift)
    if dual is None or (rows.least - rows.matrix @ full > BROKEN_S).any():
        return None
    moved = np.flatnonzero(by >= 0)
    force = np.zeros(len(rows.least))
    force[simple[by[moved]]] = dual[moved]
    return full, force


def _forward(count: int, later: Index, earlier: Index, least: Array, order: Index) -> tuple[list[float], Index]:
    """The least shifts (N,) from 0 on, and the row that pushes each event, (N,), -1 where none does."""
    shift, by = [0.0] * (count + 1), [-1] * count
    ahead, behind, lack = later[order].tolist(), earlier[order].tolist(), least[order].tolist()
    for row, j, i, asks in zip(order.tolist(), ahead, behind, lack, strict=True):
        if j >= 0 and shift[i] + asks > shift[j] + BROKEN_S:
            shift[j], by[j] = shift[i] + asks, row
    return shift[:-1], np.array(by)


def _forces(events: Events, weight: Array, earlier: Index, by: Index) -> Array | None:
    """What the row that pushes each event bears, (N,): its own weight and that of all it pushes; None where something gives."""
    force = weight.tolist()
    source = np.where(by >= 0, earlier[by], -1).tolist()
    for event in np.argsort(-events.place).tolist():
        if source[event] >= 0:
            force[source[event]] += force[event]
    force = np.array(force)
    stands = by < 0
    # What stands still bears its own weight either way.
    return None if (force[stands] >= 2.0 * weight[stands]).any() else np.where(stands, 0.0, force)
