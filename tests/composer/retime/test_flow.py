"""The circulation against the programme it is the dual of, written out for scipy."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import sparse
from scipy.optimize import linprog

from composer.retime.flow import Arcs, Budget, Unsolved, Wide, circulate, merged

NONE = Wide(sparse.csr_array((0, 4)), np.empty(0), np.empty(0))


def random_arcs(seed: int, nodes: int = 4, rows: int = 8):
    """Rows from earlier nodes to later ones, some of which may be broken at a price, and a cost for every node."""
    rng = np.random.default_rng(seed)
    pairs = [sorted(rng.choice(np.arange(-1, nodes), 2, replace=False)) for _ in range(rows)]
    earlier, later = np.array(pairs).T
    least = rng.integers(-3, 4, rows) * 0.5
    price = np.where(rng.random(rows) < 0.4, rng.uniform(0.1, 2.0, rows), np.inf)
    weight = rng.uniform(0.5, 2.0, nodes)
    return Arcs(
        np.concatenate((later, np.arange(nodes))),
        np.concatenate((earlier, np.full(nodes, -1))),
        np.concatenate((least, np.zeros(nodes))),
        np.concatenate((np.zeros(rows), -weight)),
        np.concatenate((price, weight)),
    )


def least_by_scipy(arcs: Arcs, nodes: int = 4) -> float:
    """The least cost with a column for what each arc is broken by, or displaced by either way."""
    count = len(arcs.least_s)
    at = np.zeros((count, nodes))
    at[np.arange(count)[arcs.later >= 0], arcs.later[arcs.later >= 0]] += 1.0
    at[np.arange(count)[arcs.earlier >= 0], arcs.earlier[arcs.earlier >= 0]] -= 1.0
    soft = np.flatnonzero(np.isfinite(arcs.most))
    give = np.zeros((count, len(soft)))
    give[soft, np.arange(len(soft))] = 1.0
    above = np.hstack((at, give))
    both = arcs.lowest[soft] < 0.0
    below = np.hstack((-at[soft[both]], give[soft[both]]))
    found = linprog(
        np.concatenate((np.zeros(nodes), arcs.most[soft])),
        A_ub=-np.vstack((above, below)),
        b_ub=-np.concatenate((arcs.least_s, np.zeros(both.sum()))),
        bounds=[(None, None)] * nodes + [(0.0, None)] * len(soft),
    )
    return float(found.fun)


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 100_000))
def test_forces_and_shifts_have_one_value_and_it_is_the_least_cost(seed):
    arcs = random_arcs(seed)
    force, _, shift = circulate(arcs, NONE, 4)
    padded = np.append(shift, 0.0)
    apart = padded[arcs.later] - padded[arcs.earlier]
    hard = np.isinf(arcs.most)
    assert (apart - arcs.least_s)[hard].min(initial=0.0) >= -1e-8
    short = np.where(arcs.lowest < 0.0, np.abs(apart), np.maximum(arcs.least_s - apart, 0.0))
    cost = float(arcs.most[~hard] @ short[~hard])
    assert cost == pytest.approx(float(force @ arcs.least_s), abs=1e-7)
    assert cost == pytest.approx(least_by_scipy(arcs), abs=1e-7)


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 100_000))
def test_forces_balance_at_every_node_and_keep_their_bounds(seed):
    arcs = random_arcs(seed, rows=20)
    force, _, _ = circulate(arcs, NONE, 4)
    balance = np.zeros(5)
    np.add.at(balance, arcs.later, force)
    np.add.at(balance, arcs.earlier, -force)
    assert np.abs(balance[:4]).max() <= 1e-7
    assert (force >= arcs.lowest - 1e-8).all() and (force <= arcs.most + 1e-8).all()


def test_rows_that_run_in_a_ring_have_no_shifts():
    arcs = Arcs(np.array([1, 0]), np.array([0, 1]), np.array([1.0, 0.0]), np.zeros(2), np.full(2, np.inf))
    assert circulate(arcs, NONE, 4) is None


def test_arcs_that_ask_alike_are_one_and_share_its_force_by_their_price():
    arcs = Arcs(
        np.array([1, 1, 1, 1]), np.array([0, 0, 0, 0]), np.array([1.0, 2.0, 0.5, 0.5]), np.zeros(4),
        np.array([np.inf, np.inf, 1.0, 3.0]),
    )  # fmt: skip
    few, group, share = merged(arcs, 2)
    assert sorted(few.least_s.tolist()) == [0.5, 2.0]
    assert few.most[few.least_s == 0.5].tolist() == [4.0]
    assert group[0] == group[1] and group[2] == group[3]
    assert share.tolist() == [0.0, 1.0, 0.25, 0.75]


def test_time_that_is_up_is_told_with_what_was_tried():
    with pytest.raises(Unsolved) as stopped:
        circulate(random_arcs(0), NONE, 4, Budget(lambda: 5.0, 4.0))
    assert "4 moments" in stopped.value.tried
