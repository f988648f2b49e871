"""How far snags reach if everything after them only gives way later, or everything before them only earlier."""

from heapq import heappop, heappush

import numpy as np
from numpy.typing import NDArray

from composer.retime.events import Events
from composer.retime.rows import HOLD_ROW, MOVE_ROW, ORDER_ROW, Rows

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]


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
    for ahead, behind, place in ((later, earlier, events.place), (earlier, later, -events.place)):
        found |= _pushed(ahead, behind, least, place, begin)
    return found


def _pushed(ahead: Index, behind: Index, least: Array, place: Index, begin: Flags) -> Flags:
    """Events pushed along the rows from `behind` to `ahead`, each dealt with once, in the order of `place`."""
    order = np.argsort(behind, kind="stable")
    edge = np.searchsorted(behind[order], np.arange(len(place) + 1)).tolist()
    rows, targets, lacks, rank = order.tolist(), ahead.tolist(), least.tolist(), place.tolist()
    push = [0.0] * len(place)
    waiting: list[tuple[int, int]] = []
    queued = [False] * len(place)

    def give(event: int, by: float) -> None:
        if event >= 0 and by > push[event]:
            push[event] = by
            if not queued[event]:
                queued[event] = True
                heappush(waiting, (rank[event], event))

    for row in np.flatnonzero(begin).tolist():
        give(targets[row], lacks[row])
    while waiting:
        _, event = heappop(waiting)
        for n in range(edge[event], edge[event + 1]):
            row = rows[n]
            give(targets[row], push[event] + lacks[row])
    return np.array(push) > 0.0
