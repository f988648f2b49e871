import numpy as np
import pytest

from player.governor import begin, govern, standing_at


def test_it_begins_at_rest_recovered_and_full(run_of):
    state = run_of(3).state
    assert not state.strain.any() and not state.rate.any() and not state.on.any()
    assert state.air_missing_L == 0.0 and not state.spent_s.any()


def test_it_can_begin_where_the_fibers_stand(run_of):
    governor = run_of(2).governor
    state = begin(governor, np.array([0.2, 9.0]))
    assert state.strain == pytest.approx([0.2, 0.3])
    assert govern(governor, state, np.array([0.2, 0.3]), 0.005).strain == pytest.approx([0.2, 0.3])


def test_after_a_vent_coils_and_air_are_as_spent_as_before(run_of):
    run = run_of(2, duty=0.5, max_hold_s=2.0, compressor_L_min=0.1)
    before = run.wait(0.6, 0.3)
    after = standing_at(run.governor, before, np.zeros(2))
    assert not after.strain.any() and not after.on.any() and not after.above_s.any()
    assert np.array_equal(after.spent_s, before.spent_s)
    assert after.air_missing_L == before.air_missing_L > 0.0


def test_one_found_standing_above_half_goes_on_counting_its_hold(run_of):
    run = run_of(1, max_hold_s=2.0)
    before = run.wait(0.6, 0.3)
    assert standing_at(run.governor, before, np.array([0.25])).above_s == before.above_s > 0.0
