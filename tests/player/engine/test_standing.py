"""How far fibers stand off in one run, and what grows over several."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.engine.standing import FEW, GROWN, RUNS, Standing, drifting

FIBERS = np.arange(3)
CLEAR = np.zeros(3, dtype=bool)


def stood(share, low, high, times=FEW, alarmed=CLEAR):
    standing = Standing(3)
    for _ in range(times):
        standing.sense(FIBERS, np.array(share), np.array(low), np.array(high), alarmed)
    return standing.means


def test_offsets_are_told_apart_at_rest_and_held_and_not_while_fibers_move():
    means = stood([0.02, 0.55, 0.5], [0.0, 0.6, 0.2], [0.0, 0.6, 0.6])
    assert means[0, 0] == pytest.approx(0.02) and np.isnan(means[0, 1])
    assert means[1, 1] == pytest.approx(-0.05) and np.isnan(means[1, 0])
    assert np.isnan(means[2]).all()


def test_of_few_senses_and_of_fibers_with_an_alarm_nothing_is_said():
    assert np.isnan(stood([0.02] * 3, [0.0] * 3, [0.0] * 3, times=FEW - 1)).all()
    alarmed = np.array([True, False, False])
    assert np.isnan(stood([0.02] * 3, [0.0] * 3, [0.0] * 3, alarmed=alarmed)[0]).all()


def runs(*offsets):
    """Runs of one fiber of which only the offset held is known."""
    return [np.array([[np.nan, offset]]) for offset in offsets]


def test_a_fiber_that_stands_further_off_from_run_to_run_is_told_of():
    (found,) = drifting(runs(0.0, -0.01, -0.02, -0.03, -0.04))
    assert (found.fiber, found.where, found.runs) == (0, "held", 5)
    assert found.now == -0.04 and found.a_run == pytest.approx(-0.01)


@pytest.mark.parametrize(
    "offsets",
    [
        (0.0, 0.02, 0.04),  # too few runs
        (0.05, 0.05, 0.05, 0.05),  # off, but not growing
        (0.0, 0.0, 0.2, 0.0, 0.0),  # one odd run
        (-0.06, -0.04, -0.02, 0.0),  # it comes back
        (0.0, 0.02, 0.04, 0.06, np.nan),  # not known of the last
    ],
)
def test_what_does_not_grow_is_no_drift(offsets):
    assert drifting(runs(*offsets)) == []


def test_an_odd_run_does_not_hide_a_drift():
    assert [one.where for one in drifting(runs(0.0, 0.01, -0.3, 0.03, 0.04, 0.05))] == ["held"]


@given(st.lists(st.floats(-1.0, 1.0), max_size=25))
def test_whatever_is_told_of_has_grown_by_enough(offsets):
    for one in drifting(runs(*offsets)):
        assert one.runs >= RUNS and abs(one.a_run) * 25 >= GROWN and one.now * one.a_run > 0.0
