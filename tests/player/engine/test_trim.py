"""The correction of set-points."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.engine.trim import A_SECOND, LEVELS, MOST, Trim

ONE = np.array([0])
TICK_S = 0.05
STRAIGHT = np.linspace(0.0, 1.0, 33)
"""A model by which set-points are shares of stroke."""


def one(standing=STRAIGHT, may=True):
    return Trim(np.atleast_2d(standing), np.array([may]))


def added(trim, level):
    """What is added to the set-point by which the model has a strain."""
    sent = np.interp(level, STRAIGHT, trim._standing[0])
    return trim.applied(np.array([sent]), np.array([level]))[0] - sent


def stood(trim, level, share_of, seconds, *, frozen=False, wanders=0.0, from_s=0.0, late=0):
    """What is added, tick by tick, to a fiber that stands where `share_of` has it for what is sent, sensed `late` ticks on."""
    by, seen = [], []
    for tick in range(round(seconds / TICK_S)):
        seen.append(share_of(np.interp(level, STRAIGHT, trim._standing[0]) + added(trim, level)))
        share, wanted = seen[max(len(seen) - 1 - late, 0)], np.array([level])
        trim.sense(from_s + tick * TICK_S, ONE, np.array([share]), wanted, wanted + wanders, np.array([frozen]))
        by.append(added(trim, level))
    return np.array(by)


def test_what_is_missing_is_made_up_within_a_second_and_not_overdone():
    by = stood(one(), 0.5, lambda sent: 0.92 * sent, 1.0)
    assert 0.92 * (0.5 + by[-1]) == pytest.approx(0.5, abs=2e-3)
    assert by.max() < 0.045 and np.diff(by).max() <= A_SECOND * TICK_S + 1e-12


@pytest.mark.parametrize("late", [2, 4, 8])
@pytest.mark.parametrize("slope", [0.6, 1.0, 1.4])
def test_what_late_senses_tell_does_not_make_it_swing(late, slope):
    """Senses up to 0.4 s late, of a fiber that answers by less or more than the model has it."""
    by = stood(one(), 0.5, lambda sent: 0.5 + slope * (sent - 0.5) - 0.05, 20.0, late=late)
    assert np.abs(by).max() < 1.6 * 0.05 / slope
    assert np.abs(by[-100:] - 0.05 / slope).max() < 4e-3


def test_by_a_model_that_is_bent_as_much_is_added_as_that_strain_takes():
    bent = STRAIGHT**3
    trim = one(bent)
    by = stood(trim, 0.9, lambda sent: 0.95 * max(sent, 0.0) ** (1 / 3), 2.0)
    assert by[-1] == pytest.approx((0.9 / 0.95) ** 3 - 0.9**3, abs=0.01)


def test_what_was_learned_at_a_level_is_there_at_once_the_next_time():
    trim = one()
    stood(trim, 0.5, lambda sent: sent - 0.04, 3.0)
    stood(trim, 1.0, lambda sent: sent - 0.03, 3.0, from_s=10.0)
    assert added(trim, 0.5) == pytest.approx(0.04, abs=3e-3)
    stood(trim, 0.5, lambda sent: sent - 0.04, 3.0, from_s=20.0)
    assert added(trim, 0.25) == pytest.approx(0.02, abs=0.015)


def test_at_levels_where_it_has_not_stood_it_takes_what_is_in_proportion():
    trim = one()
    stood(trim, 0.25, lambda sent: 0.9 * sent, 3.0)
    stood(trim, 0.5, lambda sent: 0.9 * sent, 3.0, from_s=10.0)
    assert added(trim, 0.75) == pytest.approx(0.75 / 0.9 - 0.75, abs=0.02)


def test_a_later_run_begins_with_what_an_earlier_one_learned():
    earlier, later = one(), one()
    stood(earlier, 0.5, lambda sent: 0.92 * sent, 2.0)
    later.begin_with(earlier.by)
    assert added(later, 0.5) == added(earlier, 0.5)
    stood(later, 0.5, lambda sent: 0.97 * sent, 2.0)
    assert 0.97 * (0.5 + added(later, 0.5)) == pytest.approx(0.5, abs=2e-3)


@given(
    st.lists(st.tuples(st.floats(0.05, 1.0), st.floats(0.0, 1.2)), min_size=1, max_size=30),
    st.floats(0.0, 0.5),
)
def test_whatever_is_sensed_a_correction_is_bounded(stands, wanders):
    trim = one()
    for number, (level, share) in enumerate(stands):
        stood(trim, level, lambda sent, share=share: share + wanders * sent, 0.5, from_s=number)
    assert np.abs(trim.by).max() <= MOST and np.abs([added(trim, level) for level in LEVELS]).max() <= MOST + 1e-9
    assert np.linalg.eigvalsh(trim._spread[0]).min() > -1e-9


def test_a_fiber_that_does_not_answer_is_asked_for_little_more():
    by = stood(one(), 0.5, lambda sent: 0.3, 60.0)
    assert by.max() <= MOST + 1e-9
    assert stood(one(), 0.5, lambda sent: 0.45, 60.0).max() < 0.06


@pytest.mark.parametrize("more", [{"frozen": True}, {"may": False}, {"wanders": 0.1}])
def test_nothing_is_corrected_on_alarm_in_motion_or_where_there_is_no_set_point(more):
    trim = one(may=more.pop("may", True))
    assert not stood(trim, 0.5, lambda sent: 0.4, 10.0, **more).any()


def test_with_an_alarm_what_was_added_stays_as_it_is():
    trim = one()
    by = stood(trim, 0.5, lambda sent: 0.92 * sent, 0.2)
    after = stood(trim, 0.5, lambda sent: 0.92 * sent, 2.0, frozen=True, from_s=0.2)
    assert (after == by[-1]).all()


def test_a_set_point_at_rest_is_left_alone_and_none_goes_beyond_its_ends():
    trim = Trim(np.array([STRAIGHT, STRAIGHT]), np.array([True, True]))
    trim.begin_with(np.full((2, len(LEVELS)), 0.05))
    assert trim.applied(np.array([0.0, 0.5]), np.array([0.0, 0.5])) == pytest.approx([0.0, 0.55])
    assert trim.applied(np.array([0.01, 0.99]), np.array([0.01, 1.0])) == pytest.approx([0.01, 1.0])


def test_at_the_end_of_its_set_point_nothing_more_is_asked():
    trim = one(np.minimum(STRAIGHT * 1.2, 1.0))
    stood(trim, 0.95, lambda sent: 0.8, 10.0)
    assert not trim.by.any()
