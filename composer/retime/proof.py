"""What holds each moved hit where it is, and what pins cost: the dual values of the optimum, read.

At an optimum what a hit would save by going back is borne by the rows that are tight there: the dual value of a row is the
force, in strokes, with which it holds. Where rhythm is kept a hit drags what follows along, so the rows that hold an
interval are those that reach across it.
"""

from dataclasses import dataclass
from heapq import heappop, heappush

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.duration import acceleration_time_s
from composer.limits.quivering import shaken
from composer.retime.events import Events
from composer.retime.rows import ABOVE_ROW, AIR_ROW, DUTY_ROW, HOLD_ROW, MOVE_ROW, ORDER_ROW, PIN_ROW, SWITCH_ROW, Rows
from composer.retime.terms import Terms
from composer.tracks import MOVE, Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]

STILL_S = 1e-9
"""An interval that differs by less is as written."""

FORCE = 1e-9
"""A row that holds with less than this, in strokes, holds nothing: the solver's rounding."""

KINDS = {
    MOVE_ROW: "move", HOLD_ROW: "rest", ORDER_ROW: "order", PIN_ROW: "pin", ABOVE_ROW: "hold", DUTY_ROW: "duty", AIR_ROW: "air",
    SWITCH_ROW: "switching",
}  # fmt: skip
"""What a row is called; "rhythm" is what a hit without a row of its own goes by."""


@dataclass(frozen=True, slots=True, eq=False)
class Proof:
    """An optimum with the rows that hold it: tracks prepared, least_s (K,), shift_s (N,), dual (M,) strokes a second."""

    tracks: Tracks
    least_s: Array
    events: Events
    rows: Rows
    terms: Terms
    shift_s: Array
    dual: Array
    abilities: Abilities
    pins: int


@dataclass(frozen=True, slots=True)
class Cause:
    """What holds a moved hit: `kind` is one of "move", "order", "pin", "hold", "duty", "air", "switching",
    "rest" and "rhythm".

    fiber, line: whose speed, hold or coil, and the entry's line; None and 0 where it is no fiber's
    from_s, to_s: instants as written that it lies between
    needs_s: what a move takes at least; by: "fill", "exhaust", "accel", "quiver" or "speed", what sets that
    after_s: the instant as written, of a landing or of the start (0), before which the move cannot leave; None where it can
    pin: number of a pin that holds the other end, -1 for none
    force: strokes: what a second less of it would spare, in stroke-seconds
    """

    kind: str
    fiber: int | None
    from_s: float
    to_s: float
    needs_s: float
    by: str
    after_s: float | None
    pin: int
    line: int
    force: float


@dataclass(frozen=True, slots=True)
class PinCost:
    """What a pin costs: stroke-seconds spared for each second that it would give, later (above 0) or earlier (below 0)."""

    pin: int
    force: float


def pin_costs(proof: Proof) -> list[PinCost]:
    """One for each pin, in the order of time; 0 where a pin holds nothing back.

    True for the first of what a pin gives; more never spares more than that much for each second.
    """
    force = np.zeros(proof.pins)
    chosen = np.flatnonzero(proof.rows.kind == PIN_ROW)
    sign = np.asarray(proof.rows.matrix[chosen].sum(axis=1)).ravel()
    np.add.at(force, proof.rows.knot[chosen], -sign * proof.dual[chosen])
    force[np.abs(force) <= FORCE] = 0.0
    return [PinCost(pin, float(value)) for pin, value in enumerate(force)]


def causes(proof: Proof) -> list[Cause]:
    """What holds each moved hit, in the order of time, by the row that holds it hardest."""
    shift = proof.shift_s
    hits = np.flatnonzero(shift[: proof.events.hits]).tolist()
    own = shift - np.append(shift, 0.0)[proof.terms.behind]
    held = [hit for hit in hits if abs(own[hit]) > STILL_S]
    hardest = _hardest(proof, held, own)
    tell = _Teller(proof)
    return [tell.of_row(*hardest[hit]) if hit in hardest else tell.rhythm(hit) for hit in hits]


def _hardest(proof: Proof, hits: list[int], own: Array) -> dict[int, tuple[int, float]]:
    """For each hit whose own interval changed, the row that holds it hardest, and with how much."""
    low, high, force, row = _reaches(proof)
    found: dict[int, tuple[int, float]] = {}
    for sign in (1.0, -1.0):
        mine = np.flatnonzero(sign * force > FORCE)
        mine = mine[np.argsort(low[mine], kind="stable")].tolist()
        heap: list[tuple[float, int, int]] = []
        at = 0
        for hit in hits:
            if sign * own[hit] <= 0.0:
                continue
            while at < len(mine) and low[mine[at]] <= hit:
                heappush(heap, (-sign * float(force[mine[at]]), int(row[mine[at]]), int(high[mine[at]])))
                at += 1
            while heap and heap[0][2] < hit:
                heappop(heap)
            if heap:
                found[hit] = (heap[0][1], -heap[0][0])
    return found


def _reaches(proof: Proof) -> tuple[Index, Index, Array, Index]:
    """Which hits' intervals (low to high) each tight row bears on, with what force, and its number.

    A hit that keeps the clock begins a chain of those behind it that keep rhythm; a row bears on an interval with the sum
    of what it asks of the hits from there to the chain's end.
    """
    events, terms = proof.events, proof.terms
    numbers = np.arange(len(events.written_s))
    chain = np.cumsum(terms.behind[: events.hits] < 0) - 1
    begins = np.flatnonzero(terms.behind[: events.hits] < 0)
    key = np.where(numbers < events.hits, numbers, np.where(terms.behind >= 0, events.own_hit, -1))
    tight = np.flatnonzero(proof.dual > FORCE)
    part = proof.rows.matrix[tight]
    row = np.repeat(tight, np.diff(part.indptr))
    at = key[part.indices]
    # A free start that keeps the clock bears its own cost.
    real = at >= 0
    row, at, force = row[real], at[real], (part.data * proof.dual[row])[real]
    order = np.lexsort((at, row))
    row, at, force = row[order], at[order], force[order]
    if not len(row):
        none = np.empty(0, dtype=np.int64)
        return none, none, np.empty(0), none
    fresh = np.concatenate(([True], (row[1:] != row[:-1]) | (chain[at[1:]] != chain[at[:-1]])))
    ends = np.append(np.flatnonzero(fresh)[1:], len(row))[np.cumsum(fresh) - 1]
    total = np.concatenate(([0.0], np.cumsum(force)))
    low = np.where(fresh, begins[chain[at]], np.concatenate(([0], at[:-1])) + 1)
    return low, at, total[ends] - total[:-1], row


class _Teller:
    """Rows as causes."""

    def __init__(self, proof: Proof):
        self.proof = proof
        self.fiber = fiber_of(proof.tracks)
        rows = proof.rows
        self.row_of = {
            kind: dict(zip(rows.knot[rows.kind == kind].tolist(), np.flatnonzero(rows.kind == kind).tolist(), strict=True))
            for kind in (MOVE_ROW, HOLD_ROW)
        }
        tight = np.flatnonzero(proof.dual > FORCE)
        part = rows.matrix[tight]
        row = np.repeat(tight, np.diff(part.indptr))
        order = np.argsort(part.indices, kind="stable")
        self.event, self.row = part.indices[order], row[order]
        self.push = (part.data * proof.dual[row])[order]
        slack = rows.matrix @ proof.shift_s - rows.least
        held = np.flatnonzero((rows.kind == PIN_ROW) & (slack <= STILL_S))
        self.pin_of = dict(zip(rows.matrix[held].indices.tolist(), rows.knot[held].tolist(), strict=True))

    def rhythm(self, hit: int) -> Cause:
        """A hit that keeps its distance from the one before it."""
        written = self.proof.events.written_s
        return Cause("rhythm", None, float(written[hit - 1]) if hit else 0.0, float(written[hit]), 0.0, "", None, -1, 0, 0.0)

    def of_row(self, row: int, force: float) -> Cause:
        """The cause that a row stands for."""
        proof, kind, knot = self.proof, int(self.proof.rows.kind[row]), int(self.proof.rows.knot[row])
        if kind == HOLD_ROW:
            tied = proof.events.offset_s[knot + 1] != 0.0
            if tied or knot + 1 in self.row_of[MOVE_ROW]:
                return self._move(knot + 1, force, row)
        if kind == MOVE_ROW:
            behind = self._behind(int(proof.events.event[knot]), row)
            if behind >= 0:
                return self.of_row(behind, force)
            return self._move(knot, force, self.row_of[HOLD_ROW].get(knot - 1))
        from_s, to_s = self._between(row)
        own = kind in (ABOVE_ROW, DUTY_ROW, SWITCH_ROW, HOLD_ROW) and knot >= 0
        pin = knot if kind == PIN_ROW else -1
        fiber, line = (int(self.fiber[knot]), int(proof.tracks.line[knot])) if own else (None, 0)
        return Cause(KINDS[kind], fiber, from_s, to_s, 0.0, "", None, pin, line, force)

    def _behind(self, start: int, row: int) -> int:
        """The row over coil, hold or air that pushes a free start against its move's row harder than any rest, -1 for none."""
        if start < self.proof.events.hits:
            return -1
        mine = slice(*np.searchsorted(self.event, (start, start + 1)))
        push, by = self.push[mine], self.row[mine]
        if not (push > FORCE).any():
            return -1
        hardest = int(by[np.argmax(push)])
        return hardest if hardest != row and self.proof.rows.kind[hardest] >= ABOVE_ROW else -1

    def _move(self, knot: int, force: float, rest: int | None) -> Cause:
        """A move that takes at least so long, and, where the rest before it is used up, what it leaves after."""
        proof, events = self.proof, self.proof.events
        tracks = proof.tracks
        begin, end = int(events.event[knot]), int(events.event[knot + 1])
        after = None
        if begin < events.hits and begin != end:
            after = float(events.written_s[begin]) if begin >= 0 else 0.0
        elif rest is not None and (proof.dual[rest] > FORCE or begin == end):
            before = int(events.event[int(proof.rows.knot[rest])])
            after = float(events.written_s[before]) if before >= 0 else 0.0
        curve = tracks.curve[knot : knot + 1]
        fiber = self.fiber[knot : knot + 1]
        by = "speed"
        if (moves := shaken(tracks)) is not None and len(moves.of(np.array([knot]))[0]):
            by = "quiver"
        elif tracks.manner[knot] == MOVE and acceleration_time_s(
            proof.abilities, fiber, curve, tracks.shape[knot : knot + 1]
        ) >= proof.least_s[knot] * (1.0 - 1e-9):
            by = "accel"
        elif tracks.shape[knot] >= 0:
            by = "fill" if curve[0, 1:].sum() > 0.0 else "exhaust"
        return Cause(
            "move", int(fiber[0]), float(tracks.time_s[knot]), float(events.written_s[end]), float(proof.least_s[knot]), by,
            after, self.pin_of.get(end, -1), int(tracks.line[knot]), force,
        )  # fmt: skip

    def _between(self, row: int) -> tuple[float, float]:
        """The first and last instant, as written, that a row speaks of."""
        matrix, written = self.proof.rows.matrix, self.proof.events.written_s
        at = written[matrix.indices[matrix.indptr[row] : matrix.indptr[row + 1]]]
        one_sided = len(at) == 1 and self.proof.rows.kind[row] != PIN_ROW
        return (0.0 if one_sided else float(at.min(initial=np.inf))), float(at.max(initial=0.0))
