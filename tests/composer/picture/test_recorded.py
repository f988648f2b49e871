"""A run as tracks for a cloth."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from composer.limits.abilities import abilities_of
from composer.motion import strain_at
from composer.picture.recorded import SAME, recorded
from composer.tracks import HOLD

TIMES = np.linspace(0.0, 6.0, 61)


@given(strain=arrays(np.float32, (3, 61), elements=st.floats(0.0, 0.25, width=32)))
def test_what_is_recorded_runs_through_the_samples_and_straight_between_them(make_rig, strain):
    rig = make_rig(3)
    tracks = recorded(TIMES, strain, np.full(3, 0.3), 6.0)
    asked = np.linspace(0.0, 6.0, 241)
    was = np.array([np.interp(asked, TIMES, row) for row in strain])
    # What is left out may add up along a slow bend, but never to anything seen.
    assert strain_at(tracks, abilities_of(rig), asked) == pytest.approx(was, abs=61 * SAME * 0.3 * 61 / 8)


def test_still_fibers_and_straight_ways_need_few_samples():
    strain = np.array([np.full(61, 0.1), np.interp(TIMES, [0, 2, 4, 6], [0, 0, 0.3, 0.3])])
    tracks = recorded(TIMES, strain, np.full(2, 0.3), 6.0)
    assert len(tracks.time_s) <= 3 + 6


def test_nothing_lands_in_it():
    strain = np.random.default_rng(1).uniform(0.0, 0.3, (2, 61))
    tracks = recorded(TIMES, strain, np.full(2, 0.3), 6.0)
    assert (tracks.manner == HOLD).all()
    assert tracks.moves == 0


@pytest.mark.parametrize("count", [1, 2, 3])
def test_a_run_of_one_sample_or_two_is_recorded_too(count):
    tracks = recorded(TIMES[:count], np.full((2, count), 0.2), np.full(2, 0.3), 6.0)
    assert tracks.fibers == 2
    assert tracks.curve[:, 0] == pytest.approx(0.2)
    assert (tracks.time_s[tracks.first[:-1]] == 0.0).all()
