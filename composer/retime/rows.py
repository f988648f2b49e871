"""The rows of the programme: what the displacements of the events must satisfy, all of the form `matrix @ shift >= least`."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from composer.retime.events import Events
from composer.tracks import HOLD, SAME_INSTANT_S, STEP, SUDDEN, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]

MOVE_ROW, HOLD_ROW, ORDER_ROW, PIN_ROW, ABOVE_ROW, DUTY_ROW, AIR_ROW, SWITCH_ROW = range(8)
"""What a row stands for; those from ABOVE_ROW on are given up where no times keep them."""

ALREADY = 4e-7
"""A move that lasts at least this share less than it must is no snag (the checker allows 1e-6 of a rate or acceleration)."""


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """M rows over N events.

    matrix: (M, N) csr
    least: (M,) seconds
    kind: (M,) one of the kinds above
    knot: (M,) the segment that a row speaks of, a pin's number for PIN_ROW, -1 for none
    """

    matrix: sparse.csr_array
    least: Array
    kind: NDArray[np.int8]
    knot: Index

    def short(self, shift_s: Array, allowed_s: float = 1e-9) -> Index:
        """The rows that displacements (N,) break by more than `allowed_s`."""
        return np.flatnonzero(self.least - self.matrix @ shift_s > allowed_s)


def joined(parts: list[Rows]) -> Rows:
    """Rows of several parts, one after another."""
    parts = [part for part in parts if len(part.least)] or parts[:1]
    if len(parts) == 1:
        return parts[0]
    return Rows(
        sparse.vstack([part.matrix for part in parts], format="csr"),
        np.concatenate([part.least for part in parts]),
        np.concatenate([part.kind for part in parts]),
        np.concatenate([part.knot for part in parts]),
    )


def differences(events: Events, later: Index, earlier: Index, least: Array, kind: int, knot: Index) -> Rows:
    """Rows `shift[later] - shift[earlier] >= least`; either may be -1, which stands still."""
    count = len(later)
    # Written as it is kept, two columns a row at most in their order: an editor asks for it at every keystroke.
    columns = np.column_stack((np.minimum(later, earlier), np.maximum(later, earlier)))
    values = np.where((later < earlier)[:, None], (1.0, -1.0), (-1.0, 1.0))
    moves = columns >= 0
    ends = np.concatenate(([0], np.cumsum(np.count_nonzero(moves, axis=1))))
    matrix = sparse.csr_array((values[moves], columns[moves], ends), shape=(count, len(events.written_s)))
    return Rows(matrix, least, np.full(count, kind, dtype=np.int8), knot)


def segment_ends(tracks: Tracks) -> Index:
    """The segments that end: all knots but the last of each fiber."""
    return np.setdiff1d(np.arange(len(tracks.time_s)), tracks.first[1:] - 1, assume_unique=True)


def duration_rows(tracks: Tracks, events: Events, least_s: Array) -> Rows:
    """Every moving segment lasts at least its least duration, every hold at least 0."""
    k = segment_ends(tracks)
    later, earlier = events.event[k + 1], events.event[k]
    tied = (tracks.manner[k] == SUDDEN) | (tracks.manner[k] == STEP)
    keep = ~tied & (later != earlier)
    k, later, earlier = k[keep], later[keep], earlier[keep]

    def at(event: Index, knot: Index) -> Array:
        hung = events.written_s[np.maximum(event, 0)] + events.offset_s[knot] if len(events.written_s) else np.zeros(len(knot))
        return np.where(event < 0, tracks.time_s[knot], hung)

    end = at(later, k + 1)
    lasts = end - at(earlier, k)
    lack = least_s[k] - lasts
    moving = tracks.manner[k] != HOLD
    # Rounding of written times, and what the checker lets pass, must not move what is no snag.
    allowed = np.where(moving, ALREADY * least_s[k], SAME_INSTANT_S) + 8.0 * np.spacing(np.abs(end))
    lack = np.where((lack > 0.0) & (lack <= allowed), 0.0, lack)
    return joined(
        [
            differences(events, later[part], earlier[part], lack[part], kind, k[part])
            for part, kind in ((moving, MOVE_ROW), (~moving, HOLD_ROW))
        ]
    )


def order_rows(events: Events) -> Rows:
    """Hits keep their order, the first one not before the start."""
    hits = np.arange(events.hits)
    gaps = -np.diff(events.written_s[: events.hits], prepend=0.0)
    return differences(events, hits, hits - 1, np.minimum(gaps, 0.0), ORDER_ROW, np.full(events.hits, -1))


def pin_rows(events: Events, pins_s: Array, give_s: Array) -> Rows:
    """A pinned hit stays within `give_s` of where it is; where no hit is pinned, the hits around stay on their sides."""
    written = events.written_s[: events.hits]
    later: list[int] = []
    earlier: list[int] = []
    least: list[float] = []
    pin: list[int] = []

    def not_before(hit: int, shift_s: float, number: int) -> None:
        later.append(hit), earlier.append(-1), least.append(min(shift_s, 0.0)), pin.append(number)

    def not_after(hit: int, shift_s: float, number: int) -> None:
        later.append(-1), earlier.append(hit), least.append(min(-shift_s, 0.0)), pin.append(number)

    for number, (at_s, give) in enumerate(zip(pins_s, give_s, strict=True)):
        after = int(np.searchsorted(written, at_s - SAME_INSTANT_S))
        if after < events.hits and written[after] <= at_s + SAME_INSTANT_S:
            not_before(after, -give, number)
            not_after(after, give, number)
            continue
        if after < events.hits:
            not_before(after, at_s - give - written[after], number)
        if after > 0:
            not_after(after - 1, at_s + give - written[after - 1], number)
    return differences(
        events, np.array(later, dtype=np.int64), np.array(earlier, dtype=np.int64), np.array(least), PIN_ROW,
        np.array(pin, dtype=np.int64),
    )  # fmt: skip


def no_rows(events: Events) -> Rows:
    """No rows at all."""
    none = np.empty(0, dtype=np.int64)
    return differences(events, none, none, np.empty(0), ORDER_ROW, none)


@dataclass(frozen=True, slots=True, eq=False)
class Sums:
    """Sums of durations that must not be too long: (P,) parts `row`, `segment`, `share`, and for each of R rows `most_s`.

    A row's sum is that of its parts' shares times what their segments last.
    """

    row: Index
    segment: Index
    share: Array
    most_s: Array


def sum_rows(tracks: Tracks, events: Events, sums: Sums, kind: int, knot: Index) -> Rows:
    """Rows `sum <= most_s`; knot: (R,) a segment to name for each. No part may be the hold without end of a fiber."""
    later, offset = events.event[sums.segment + 1], events.offset_s[sums.segment + 1]
    earlier = events.event[sums.segment]
    written = np.append(events.written_s, 0.0)
    start = np.where(earlier < 0, tracks.time_s[sums.segment], written[earlier] + events.offset_s[sums.segment])
    lasts = written[later] + offset - start
    count = len(sums.most_s)
    constant = np.bincount(sums.row, weights=sums.share * lasts, minlength=count)
    columns = np.concatenate((later, earlier))
    rows, values = np.tile(sums.row, 2), np.concatenate((-sums.share, sums.share))
    real = columns >= 0
    matrix = sparse.csr_array((values[real], (rows[real], columns[real])), shape=(count, len(events.written_s)))
    matrix.sum_duplicates()
    matrix.data[np.abs(matrix.data) < 1e-14] = 0.0
    matrix.eliminate_zeros()
    lack = constant - sums.most_s
    lack = np.where((lack > 0.0) & (lack <= ALREADY * np.abs(sums.most_s)), 0.0, lack)
    return Rows(matrix, lack, np.full(count, kind, dtype=np.int8), knot)


def picked(rows: Rows, chosen: Index | NDArray[np.bool_]) -> Rows:
    """Some of the rows."""
    return Rows(rows.matrix[chosen], rows.least[chosen], rows.kind[chosen], rows.knot[chosen])
