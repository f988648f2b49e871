"""Passages that share no row, solved apart, each kept in the solver from one round to the next."""

import numpy as np
from numpy.typing import NDArray
from scipy import sparse
from scipy.sparse.csgraph import connected_components

from composer.retime.flow import Budget
from composer.retime.programme import Programme, Solved
from composer.retime.rows import Rows
from composer.retime.terms import Contracted

Array = NDArray[np.float64]
Index = NDArray[np.int64]

BUNDLE = 500
"""Passages of fewer events are solved together with their neighbours until there are so many."""


class Parts:
    """A programme as passages that share neither row nor term. What did not change since it was last solved is kept."""

    def __init__(self):
        self.kept: list[tuple[Programme, Solved]] = []
        self.owner = np.empty(0, dtype=np.int64)
        self.price = np.inf

    def solve(
        self, rows: Rows, chosen: Index, events: Index, terms: Contracted, budget: Budget, slack_price: float = np.inf
    ) -> Solved | None:
        """As `programme.solve`. The rows of one time must begin with those of the time before."""
        count = rows.matrix.shape[1]
        number = np.full(count, -1, dtype=np.int64)
        number[events] = np.arange(len(events))
        part_of, bundles = _bundles(rows, chosen, events, terms, number)
        if len(self.owner) != count or self.price != slack_price:
            self.kept, self.owner, self.price = [], np.full(count, -1, dtype=np.int64), slack_price
        matrix = rows.matrix[chosen]
        # A row's first event says whose it is; one that names none, and asks for nothing, is anybody's.
        named = np.diff(matrix.indptr) > 0
        of_row = np.zeros(len(chosen), dtype=np.int64)
        of_row[named] = part_of[number[matrix.indices[matrix.indptr[:-1][named]]]]
        of_term = part_of[number[terms.event]]
        rows_by, terms_by, events_by = (_grouped(of, bundles) for of in (of_row, of_term, part_of))
        shift, dual, bound = np.zeros(len(events)), np.zeros(len(chosen)), 0.0
        kept, owner = [], np.full(count, -1, dtype=np.int64)
        for mine, own, priced in zip(rows_by, events_by, terms_by, strict=True):
            one = self._solved(rows, chosen[mine], events[own], _picked(terms, priced), budget, slack_price)
            if one is None:
                self.kept, self.owner = [], np.empty(0, dtype=np.int64)
                return None
            owner[events[own]] = len(kept)
            kept.append(one)
            shift[own], dual[mine] = one[1].shift_s, one[1].dual
            bound += one[1].bound
        self.kept, self.owner = kept, owner
        return Solved(shift, bound, dual)

    def _solved(
        self, rows: Rows, chosen: Index, events: Index, terms: Contracted, budget: Budget, slack_price: float
    ) -> tuple[Programme, Solved] | None:
        before, of_each = np.unique(self.owner[events], return_counts=True)
        of_each[before < 0] = 0
        if of_each.max(initial=0) > 0:
            # Where passages have met, the largest goes on and takes in the others.
            programme, solved = self.kept[int(before[np.argmax(of_each)])]
            rows_before, events_before = len(programme.chosen), len(programme.events)
            if programme.grow(rows, chosen, events, terms):
                if len(chosen) == rows_before and len(events) == events_before:
                    return programme, solved
                found = programme.solve(rows, budget)
                return None if found is None else (programme, found)
        programme = Programme(rows, chosen, events, terms, slack_price)
        found = programme.solve(rows, budget)
        return None if found is None else (programme, found)


def _bundles(rows: Rows, chosen: Index, events: Index, terms: Contracted, number: Index) -> tuple[Index, int]:
    """(n,) the bundle of each event, and how many bundles."""
    n = len(events)
    part = rows.matrix[chosen]
    lengths = np.diff(part.indptr)
    first = np.repeat(part.indices[np.minimum(part.indptr[:-1], max(len(part.indices) - 1, 0))], lengths)
    hung = terms.behind >= 0
    one = np.concatenate((number[part.indices], number[terms.event[hung]]))
    other = np.concatenate((number[first], number[terms.behind[hung]]))
    links = sparse.coo_array((np.ones(len(one), dtype=np.int8), (one, other)), shape=(n, n))
    parts, label = connected_components(links.tocsr(), directed=False)
    sizes = np.bincount(label, minlength=parts)
    # In the order of their first events, small ones go together.
    begin = np.full(parts, n)
    np.minimum.at(begin, label, np.arange(n))
    order = np.argsort(begin)
    small = np.where(sizes[order] < BUNDLE, sizes[order], 0)
    filled = (np.cumsum(small) - small) // BUNDLE
    # Large ones stand alone, so that they are found again whatever happens to small ones.
    bundle = np.empty(parts, dtype=np.int64)
    bundle[order] = np.where(small > 0, filled, filled.max(initial=-1) + np.cumsum(small == 0))
    bundle = np.unique(bundle, return_inverse=True)[1]
    return bundle[label], int(bundle.max(initial=-1)) + 1


def _grouped(label: Index, count: int) -> list[Index]:
    """The places of each label, in order."""
    order = np.argsort(label, kind="stable")
    return np.split(order, np.searchsorted(label[order], np.arange(1, count)))


def _picked(terms: Contracted, chosen: Index) -> Contracted:
    return Contracted(terms.event[chosen], terms.behind[chosen], terms.weight[chosen], terms.giver[chosen])
