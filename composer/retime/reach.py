"""How far snags reach if everything after them only gives way later, or everything before them only earlier."""

import numpy as np
from numpy.typing import NDArray

from composer.retime.events import Events
from composer.retime.rows import HOLD_ROW, MOVE_ROW, ORDER_ROW, Rows

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]


ROUNDS = 60
"""How far a push is followed; what lies beyond is asked for by the rows that are then found broken."""


def pairs(rows: Rows, chosen: Index) -> tuple[Index, Index, Array]:
    """Later and earlier event of difference rows, -1 for none, and the least difference of their displacements."""
    part = rows.matrix[chosen]
    row = np.repeat(np.arange(len(chosen)), np.diff(part.indptr))
    later = np.full(len(chosen), -1, dtype=np.int64)
    earlier = np.full(len(chosen), -1, dtype=np.int64)
    plus = part.data > 0.0
    later[row[plus]] = part.indices[plus]
    earlier[row[~plus]] = part.indices[~plus]
    return later, earlier, rows.least[chosen]


def simple_rows(rows: Rows) -> Index:
    """The rows between two events in time: moves, holds, order."""
    return np.flatnonzero(np.isin(rows.kind, (MOVE_ROW, HOLD_ROW, ORDER_ROW)))


def reached(events: Events, rows: Rows, broken: Index) -> Flags:
    """The events that give way if the broken rows are mended by moving all that follows later, or all that precedes earlier.

    A good guess at what the optimum moves: it gives way both ways, and so by less each.
    """
    later, earlier, least = pairs(rows, simple_rows(rows))
    start = np.zeros(len(rows.least), dtype=bool)
    start[broken] = True
    begin = start[simple_rows(rows)]
    found = np.zeros(len(events.place), dtype=bool)
    for ahead, behind in ((later, earlier), (earlier, later)):
        found |= _pushed(ahead, behind, least, len(found), begin)
    return found


def _pushed(ahead: Index, behind: Index, least: Array, count: int, begin: Flags) -> Flags:
    """Events pushed along the rows from `behind` to `ahead`: what was pushed further in one round passes it on in the next."""
    order = np.argsort(behind)
    edge = np.searchsorted(behind[order], np.arange(count + 1))
    push, fresh = np.zeros(count), np.zeros(count, dtype=bool)
    rows, by = np.flatnonzero(begin), least[begin]
    for _ in range(ROUNDS):
        target = ahead[rows]
        further = np.flatnonzero(target >= 0)
        further = further[by[further] > push[target[further]]]
        if not len(further):
            break
        np.maximum.at(push, target[further], by[further])
        fresh[target[further]] = True
        moved = np.flatnonzero(fresh)
        fresh[moved] = False
        each = edge[moved + 1] - edge[moved]
        number = np.arange(each.sum()) - np.repeat(np.cumsum(each) - each, each)
        rows = order[np.repeat(edge[moved], each) + number]
        by = np.repeat(push[moved], each) + least[rows]
    return push > 0.0
