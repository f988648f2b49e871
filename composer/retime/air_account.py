"""What the receiver goes through at any displacements of the events, and how that changes with them, fast enough to search by.

Each fill is laid out as straight pieces between nodes, at shares of its time that stay its own wherever it goes. The receiver's
condition over the span between any two nodes is a row that holds at every timing; about the times at hand it is made
linear. Where fills begin or end at one instant their order decides the slope: the times are moved apart by a hair, at random
but always alike, as in gradient sampling (Burke, Lewis and Overton 2005).
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.air import even, litres_at_shares, refill_L_s, store_L
from composer.limits.duration import STEP_S
from composer.limits.fills import Fills, fills_of
from composer.limits.quivering import shaken
from composer.retime.stage import Stage
from composer.rig.model import Rig
from composer.shapes import NAMES
from composer.tracks import Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]

FEWEST, MOST, NODES = 8, 32, 4000
"""Straight pieces that a curved fill is laid out as: as many as give so many nodes in all, within bounds."""

IN_VIEW, ROWS = 0.5, 80
"""Spans are in view that miss at least this share of the store; and how many rows at most."""

PAIRS = 2_000_000
"""Pairs of begin and end looked at at a time."""

HAIR_S = 1e-7
"""By how much times are moved apart where they coincide."""


@dataclass(frozen=True, slots=True, eq=False)
class Account:
    """The fills of a stage, P of them with M nodes in all.

    fill, share, litres: (M,) whose node, the share of its fill's time, and what the fill has drawn there
    start, end: (P,) events that the move of each fill hangs from (-1: stands still at 0 s), u_from, u_to the shares of the move
    between which it fills; offset: (P,) how much later than its event a move's start is (a sudden's); written_s (N + 1,)
    free: (n,) events that may move; column: (N + 1,) their places among these, n for all others
    """

    fill: Index
    share: Array
    litres: Array
    start: Index
    end: Index
    u_from: Array
    u_to: Array
    offset: Array
    at_once: NDArray[np.bool_]
    written_s: Array
    free: Index
    column: Index
    store: float
    refill: float

    def instants(self, shift_s: Array) -> Array:
        """(M,) when each node is."""
        at = self.written_s + np.append(shift_s, 0.0)
        begin, finish = at[self.start] + self.offset, at[self.end]
        lasts = np.maximum(finish - begin, 0.0)
        from_s = begin + self.u_from * lasts
        to_s = np.where(self.at_once, from_s + STEP_S, begin + self.u_to * lasts)
        to_s = np.maximum(to_s, from_s + 1e-9)
        return from_s[self.fill] + self.share * (to_s - from_s)[self.fill]

    def missing(self, shift_s: Array) -> tuple[Array, Index, Array, Array]:
        """(M,) litres missing from the brim at each node in order of time, that order, instants, and demand less refill."""
        time = self.instants(shift_s)
        last = np.append(self.fill[1:] != self.fill[:-1], True)
        flow = np.zeros(len(time))
        inner = np.flatnonzero(~last)
        flow[inner] = (self.litres[inner + 1] - self.litres[inner]) / np.maximum(time[inner + 1] - time[inner], 1e-12)
        before = np.concatenate(([0.0], flow[:-1]))
        before[self.share == 0.0] = 0.0
        order = np.argsort(time, kind="stable")
        at = time[order]
        rates = np.cumsum((flow - before)[order])
        litres = np.concatenate(([0.0], np.cumsum(np.maximum(rates[:-1], 0.0) * np.diff(at))))
        short = litres - self.refill * at
        return short - np.minimum.accumulate(short), order, at, short

    def overdraft_s(self, shift_s: Array) -> float:
        """By how many seconds of refill the deepest span overdraws the store."""
        return max(float(self.missing(shift_s)[0].max(initial=0.0)) - self.store, 0.0) / self.refill

    def rows(self, shift_s: Array) -> tuple[Array, Array]:
        """(R, n), (R,): the spans in view, made linear about shifts (N,); `matrix @ shift[free] >= least`, s of refill."""
        missing, order, at, short = self.missing(shift_s)
        # A span that asks most begins where demand less refill turns up and ends where it turns down.
        rise = np.diff(short)
        up = np.append(rise > 0.0, False)
        down = np.concatenate(([True], rise <= 0.0))
        # No span up to an instant asks for more than is missing there, and none from one for more than it will yet rise.
        view = (1.0 - IN_VIEW) * self.store
        to_come = np.maximum.accumulate(short[::-1])[::-1] - short
        begins, ends = np.flatnonzero(up & down & (to_come > view)), np.flatnonzero(~up & ~down & (missing > view))
        if not len(begins) or not len(ends):
            return np.empty((0, len(self.free))), np.empty(0)
        end, begin, deep = self._deepest(short, begins, ends, view)
        used, place = np.unique(np.concatenate((begins[begin], ends[end])), return_inverse=True)
        slope = self._slopes(order[used], at[used], shift_s)
        matrix = (slope[place[: len(deep)]] - slope[place[len(deep) :]]) / self.refill
        over = (deep - self.store) / self.refill
        return matrix, over + matrix @ shift_s[self.free]

    @staticmethod
    def _deepest(short: Array, begins: Index, ends: Index, view: float) -> tuple[Index, Index, Array]:
        """The spans that ask for more than `view`, the deepest ROWS of them: places in `ends` and `begins`, and litres."""
        end, begin, deep = np.empty(0, dtype=np.int64), np.empty(0, dtype=np.int64), np.empty(0)
        block = max(1, PAIRS // len(begins))
        for first in range(0, len(ends), block):
            some = ends[first : first + block]
            span = short[some][:, None] - short[begins][None, :]
            span[begins[None, :] >= some[:, None]] = -np.inf
            seen = np.flatnonzero(span.ravel() > view)
            which, start = np.divmod(seen, len(begins))
            deep = np.concatenate((deep, span.ravel()[seen]))
            end, begin = np.concatenate((end, which + first)), np.concatenate((begin, start))
            kept = np.argsort(-deep, kind="stable")[:ROWS]
            end, begin, deep = end[kept], begin[kept], deep[kept]
        return end, begin, deep

    def _slopes(self, nodes: Index, time: Array, shift_s: Array) -> Array:
        """(V, n) how demand less refill at some nodes changes with each free event's shift."""
        at = self.written_s + np.append(shift_s, 0.0)
        begin, finish = at[self.start] + self.offset, at[self.end]
        lasts = np.maximum(finish - begin, 1e-9)
        slope = np.zeros((len(nodes), len(self.free) + 1))
        start, end = self.column[self.start], self.column[self.end]
        own = self.fill[nodes]
        # What draws there: the piece of each fill that is under way.
        when = self.instants(shift_s)
        inner = np.flatnonzero(self.fill[1:] == self.fill[:-1])
        v, piece = np.nonzero((when[inner][None, :] < time[:, None]) & (when[inner + 1][None, :] >= time[:, None]))
        mine = self.fill[inner[piece]] == own[v]
        piece = inner[piece]
        flow = (self.litres[piece + 1] - self.litres[piece]) / np.maximum(when[piece + 1] - when[piece], 1e-12)
        flow, v, which = flow[~mine], v[~mine], self.fill[piece[~mine]]
        total = np.bincount(v, weights=flow, minlength=len(nodes)) - self.refill
        still = self.at_once[which]
        share = np.where(still, 0.0, (time[v] - begin[which]) / lasts[which])
        np.add.at(slope, (v, start[which]), -flow * (1.0 - share))
        np.add.at(slope, (v, end[which]), -flow * share)
        # The node itself goes with its own move.
        u = np.where(self.at_once[own], 0.0, self.u_from[own] + self.share[nodes] * (self.u_to - self.u_from)[own])
        np.add.at(slope, (np.arange(len(nodes)), start[own]), total * (1.0 - u))
        np.add.at(slope, (np.arange(len(nodes)), end[own]), total * u)
        # The last place stands for all that stands still.
        return slope[:, :-1]


def account_of(stage: Stage, now: Tracks, rig: Rig, abilities: Abilities, free: Index, curved: int = 0) -> Account:
    """The account of the fills in tracks `now` of a stage; what quivers fills as it does there.

    free: (n,) events that may move; curved: straight pieces that a curved fill is laid out as, 0: by how many fills there are
    """
    fills = fills_of(now, abilities)
    curved = curved or int(np.clip(NODES // max(len(fills.segment), 1), FEWEST, MOST))
    pieces = np.where(_straight(now, fills, abilities), 1, curved)
    fill = np.repeat(np.arange(len(pieces)), pieces + 1)
    number = np.arange(len(fill)) - np.repeat(np.cumsum(pieces + 1) - pieces - 1, pieces + 1)
    share = number / pieces[fill]
    events = stage.events
    segment = fills.segment
    column = np.full(len(events.written_s) + 1, len(free))
    column[free] = np.arange(len(free))
    return Account(
        fill, share, litres_at_shares(now, abilities, fills, fill, share), events.event[segment], events.event[segment + 1],
        fills.u_from, fills.u_to, np.where(events.event[segment] >= 0, events.offset_s[segment], 0.0), fills.at_once,
        np.append(events.written_s, 0.0), free, column, store_L(rig.supply), refill_L_s(rig.supply),
    )  # fmt: skip


def _straight(now: Tracks, fills: Fills, abilities: Abilities) -> NDArray[np.bool_]:
    straight = (now.shape[fills.segment] == NAMES.index("linear")) & even(abilities)[abilities.which[fills.fiber]]
    if (moves := shaken(now)) is not None:
        straight &= ~np.isin(fills.segment, moves.segment)
    return straight | fills.at_once
