"""Pins too close for what must happen between them, found as longest paths through the rows in the order of time."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.retime.events import Events
from composer.retime.reach import pairs, simple_rows
from composer.retime.rows import HOLD_ROW, MOVE_ROW, PIN_ROW, Rows

Array = NDArray[np.float64]
Index = NDArray[np.int64]

SHORT_S = 1e-9
"""Pins short by no more than this are not short."""


@dataclass(frozen=True, slots=True, eq=False)
class Chain:
    """What binds between two pins (or the start and a pin).

    from_s, to_s: the pins' instants; from_pin, to_pin: their numbers, -1 for the start of the score
    short_s: seconds lacking
    knots: the moving segments that follow one another in between, in order of time
    """

    from_s: float
    to_s: float
    from_pin: int
    to_pin: int
    short_s: float
    knots: tuple[int, ...]


def chains_too_long(events: Events, rows: Rows, pins_s: Array, give_s: Array) -> list[Chain]:
    """Every pin that what comes before it cannot reach in time, each with the chain that binds; empty where all fit.

    Each chain is counted from the nearest pin before it, as if that one had been reached: so each names its own lack.
    """
    simple = simple_rows(rows)
    later, earlier, lack = pairs(rows, simple)

    lowest, highest, low_pin, high_pin = _bounds(events, rows, len(events.written_s))
    order = np.argsort(events.place[later], kind="stable")
    earliest = lowest.tolist()
    by: list[int] = [-1] * len(earliest)
    done: list[Chain] = []
    at = np.concatenate((events.place, [len(earliest)]))
    rank = np.argsort(at[: len(earliest)], kind="stable")
    begin = np.searchsorted(events.place[later][order], np.arange(len(earliest) + 1))
    least, sources, sorted_rows = lack.tolist(), earlier.tolist(), order.tolist()
    for position, event in enumerate(rank.tolist()):
        for n in range(begin[position], begin[position + 1]):
            line = sorted_rows[n]
            source = sources[line]
            reach = (earliest[source] if source >= 0 else 0.0) + least[line]
            if reach > earliest[event]:
                earliest[event], by[event] = reach, line
        short = earliest[event] - highest[event]
        if short > SHORT_S:
            done.append(_chain(event, by, sources, simple, rows, low_pin, high_pin, pins_s, short, events.offset_s != 0.0))
            earliest[event], by[event] = float(highest[event]), -1
            low_pin[event] = high_pin[event]
    return done


def _bounds(events: Events, rows: Rows, count: int) -> tuple[Array, Array, Index, Index]:
    """Lowest and highest displacement that pins allow each event, (N,), and the pins' numbers, -1 where none does."""
    lowest, highest = np.full(count, -np.inf), np.full(count, np.inf)
    low_pin, high_pin = np.full(count, -1, dtype=np.int64), np.full(count, -1, dtype=np.int64)
    for row in np.flatnonzero(rows.kind == PIN_ROW).tolist():
        spot = rows.matrix.indptr[row]
        event, sign = rows.matrix.indices[spot], rows.matrix.data[spot]
        if sign > 0.0 and rows.least[row] > lowest[event]:
            lowest[event], low_pin[event] = rows.least[row], rows.knot[row]
        if sign < 0.0 and -rows.least[row] < highest[event]:
            highest[event], high_pin[event] = -rows.least[row], rows.knot[row]
    return lowest, highest, low_pin, high_pin


def _chain(
    event: int,
    by: list[int],
    sources: list[int],
    simple: Index,
    rows: Rows,
    low_pin: Index,
    high_pin: Index,
    pins_s: Array,
    short: float,
    tied: NDArray[np.bool_],
) -> Chain:
    """The chain that ends at a pinned event, followed back to where it comes from."""
    knots: list[int] = []
    here = event
    while here >= 0 and by[here] >= 0:
        line = by[here]
        knot = int(rows.knot[simple[line]])
        if rows.kind[simple[line]] == MOVE_ROW:
            knots.append(knot)
        elif rows.kind[simple[line]] == HOLD_ROW and tied[knot + 1]:
            # A hold before a sudden move is as long as what is left once that move has had its time.
            knots.append(knot + 1)
        here = sources[line]
    first = int(low_pin[here]) if here >= 0 else -1
    last = int(high_pin[event])
    return Chain(
        from_s=float(pins_s[first]) if first >= 0 else 0.0,
        to_s=float(pins_s[last]),
        from_pin=first,
        to_pin=last,
        short_s=float(short),
        knots=tuple(reversed(knots)),
    )
