"""What is kept of segments from one score to the next."""

from dataclasses import replace

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.duration import least_durations
from composer.quivers import Quivers
from composer.retime.events import strain_gone
from composer.retime.memory import measured

from .scores import random_score, tracks_of


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 10_000), st.integers(0, 10_000))
def test_what_is_remembered_is_what_would_be_measured(make_rig, one, other):
    abilities = abilities_of(make_rig(4, accel=3.0))
    first, second = random_score(one).tracks, random_score(other).tracks
    *_, memory = measured(first, abilities, None)
    least, gone, litres, _ = measured(second, abilities, memory)
    fresh_least, fresh_gone, fresh_litres, _ = measured(second, abilities, None)
    assert np.array_equal(least, fresh_least) and np.array_equal(least, least_durations(second, abilities))
    assert np.array_equal(gone, fresh_gone) and np.allclose(gone, strain_gone(second))
    assert np.array_equal(litres, fresh_litres)


def test_litres_of_a_segment_are_its_share_of_a_whole_strokes_air(make_rig):
    abilities = abilities_of(make_rig(1, air_mL=30.0))
    tracks = tracks_of([[(0.0, 0.15, "linear"), (1.0, 0.0, "linear"), (2.0, None, "end")]])
    assert np.allclose(measured(tracks, abilities, None)[2], [0.015, 0.0, 0.0])


def test_a_first_quiver_is_not_taken_for_the_still_move_beneath_it(make_rig):
    abilities = abilities_of(make_rig(1))
    still = tracks_of([[(0.0, 0.2, "linear"), (1.0, 0.0, "linear"), (3.0, None, "end")]])
    shaking = replace(still, quivers=Quivers(*(np.array([value]) for value in (0, 1, 2.0, 0.01))))
    *_, memory = measured(still, abilities, None)
    least, gone, _, _ = measured(shaking, abilities, memory)
    assert least[0] > measured(still, abilities, None)[0][0]
    assert gone[0] > 0.2 and gone[1] == 0.2


def test_segments_of_unlike_fibers_are_not_one(make_rig):
    tracks = tracks_of([[(0.0, 0.3, "linear"), (1.0, None, "end")]] * 2)
    abilities = abilities_of(make_rig(2))
    slower = replace(abilities, accel=np.array([np.inf, 0.1]), stroke=np.array([0.3, 0.4]))
    *_, memory = measured(tracks, abilities, None)
    least = measured(tracks, slower, memory)[0]
    assert np.array_equal(least, least_durations(tracks, slower))
