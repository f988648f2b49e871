"""What a governor keeps of a rig."""

from dataclasses import replace

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from player.governor import begin, governor_of, tracks_of


def test_only_fibers_with_a_limit_of_acceleration_are_braced(make_rig):
    rig = make_rig(3)
    free = replace(abilities_of(rig), accel=np.full(3, np.inf))
    for accel, braced in (([np.inf, 5.0, np.inf], [1]), ([5.0, 5.0, 5.0], [0, 1, 2]), ([np.inf] * 3, [])):
        governor = governor_of(rig, replace(free, accel=np.array(accel)))
        assert np.arange(3)[governor.braced].tolist() == braced
        assert (governor.has_braced, governor.all_braced) == (len(braced) > 0, len(braced) == 3)


def test_a_hold_is_over_only_below_half_and_a_fiber_that_has_held_too_long_is_let_down_further(make_rig):
    governor = governor_of(make_rig(2, stroke=0.3), abilities_of(make_rig(2, stroke=0.3)))
    assert governor.half == pytest.approx(0.15)
    assert (governor.let_down_to < governor.low).all()
    assert (governor.low < governor.half).all()


def test_a_valve_stays_as_long_as_its_fastest_switching_says_within_rounding(make_rig):
    rig = make_rig(1, max_switch_Hz=4.0)
    governor = governor_of(rig, abilities_of(rig))
    assert governor.min_on_s == pytest.approx(0.25, rel=1e-12)
    assert 0.0 < 0.25 - governor.sure_on_s[0] < 1e-6


def test_at_the_beginning_there_is_all_the_air_and_nothing_is_cut(make_rig):
    rig = make_rig(2)
    state = begin(governor_of(rig, abilities_of(rig)), np.array([0.1, 0.0]))
    assert (state.air_share, state.air_missing_L, state.cut.tolist()) == (1.0, 0.0, [0, 0])


def test_ticks_in_which_a_fiber_stands_are_one_hold_of_what_was_sent(make_rig):
    rig = make_rig(1)
    strain = np.array([0.0, 0.002, 0.004, 0.004, 0.004, 0.004])[:, None]
    rates = np.array([0.0, 0.4, 0.4, 0.0, 0.0, 0.0])[:, None]
    tracks = tracks_of(governor_of(rig, abilities_of(rig)), 0.005 * np.arange(6), strain, rates)
    assert tracks.manner.tolist() == [1, 1, 0]
