"""A programme that stays in the solver while rows pass through it and a box moves."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.retime.flow import ENDLESS
from composer.retime.resident import Resident
from composer.retime.stage import stage_of
from composer.retime.terms import contract

from .scores import tracks_of


@pytest.fixture
def resident(make_rig):
    # Two landings of a stroke each, the second with no time to spare.
    track = [(0.0, 0.3, "linear"), (0.5, 0.0, "linear"), (1.5, None, "end")]
    stage = stage_of(tracks_of([track]), abilities_of(make_rig(1)), np.empty(0), np.empty(0), None, False)
    every = np.arange(len(stage.events.written_s))
    terms = contract(stage.events, stage.terms, np.ones(len(every), dtype=bool))
    return Resident(stage.rows, np.arange(len(stage.rows.least)), every, terms, 50.0, ENDLESS)


FREE = np.full(2, np.inf)


def test_without_passing_rows_all_stays_as_written(resident):
    shift, cost, over = resident.least(np.empty((0, 2)), np.empty(0), -FREE, FREE)
    assert (shift.tolist(), cost, over) == ([0.0, 0.0], 0.0, 0.0)


def test_a_passing_row_binds_once_and_is_gone_the_next_time(resident):
    shift, cost, over = resident.least(np.array([[1.0, 0.0]]), np.array([0.2]), -FREE, FREE)
    assert shift == pytest.approx([0.2, 0.2])
    assert (cost, over) == (pytest.approx(0.4), pytest.approx(0.0))
    _, passed = resident.forces()
    assert passed == pytest.approx([2.0])
    assert resident.least(np.empty((0, 2)), np.empty(0), -FREE, FREE)[1] == 0.0


def test_what_a_box_does_not_allow_is_paid_for(resident):
    near = np.full(2, 0.05)
    shift, cost, over = resident.least(np.array([[1.0, 0.0]]), np.array([0.2]), -near, near)
    assert shift == pytest.approx([0.05, 0.05])
    assert over == pytest.approx(0.15)
    assert cost == pytest.approx(0.1)


def test_a_box_that_no_times_fit_has_no_answer(resident):
    assert resident.least(np.empty((0, 2)), np.empty(0), np.array([0.1, -0.1]), np.array([0.2, 0.0])) is None


def test_the_nearest_times_keep_what_stays(resident):
    assert resident.nearest(np.array([0.3, 0.3])) == pytest.approx([0.3, 0.3])
    # The first cannot come earlier, and the second not before the first.
    near = resident.nearest(np.array([-0.2, 0.1]))
    assert near == pytest.approx([0.0, 0.1])
