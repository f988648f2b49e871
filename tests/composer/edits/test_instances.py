"""Instances: who plays which line when."""

import numpy as np
import pytest

from composer.edits.instances import instances_of
from composer.tracks import HOLD, fiber_of

from .making import DEMOS, demo, made


def of(state, fibers=None):
    return instances_of(state.score, state.rig, state.abilities, state.tempo, fibers)


@pytest.mark.parametrize("name", DEMOS)
def test_every_move_of_the_tracks_begins_and_ends_where_a_line_of_an_instance_does(name):
    state = demo(name)
    all_, faults = of(state)
    assert not faults
    tracks, fiber = state.tracks, fiber_of(state.tracks)
    own = all_.fiber[all_.instance]
    for f in range(tracks.fibers):
        moving = np.flatnonzero((fiber == f) & (tracks.manner != HOLD))
        moving = moving[np.any(tracks.curve[moving, 1:] != 0.0, axis=1)]
        rows = (own == f) & all_.goes
        ends = np.sort(np.concatenate([[-np.inf], all_.leaves_s[rows], all_.stops_s[rows], [np.inf]]))
        for times in (tracks.time_s[moving], tracks.time_s[moving + 1]):
            at = np.searchsorted(ends, times)
            assert np.all(np.minimum(ends[at] - times, times - ends[at - 1]) < 1e-9)


def test_one_fibers_instances_are_those_that_it_has_among_all():
    state = demo("estuary")
    whole, _ = of(state)
    for fiber in (0, 30, 47):
        part, _ = of(state, np.arange(48) == fiber)
        mine = whole.fiber[whole.instance] == fiber
        np.testing.assert_array_equal(part.until_s, whole.until_s[mine])
        np.testing.assert_array_equal(part.line, whole.line[mine])
        np.testing.assert_array_equal(part.b, whole.b[mine])


def test_a_line_that_another_entry_takes_over_before_it_begins_is_left_out(make_rig):
    text = "tempo 60\nphrase p\n  2 full\n  4 0.5\n  6 rest\nsection s at 1:1\n  r.1 p\n  r.1 p after 3\n"
    all_, _ = of(made(text, make_rig(1)))
    assert all_.place.tolist() == [0, 1, 0, 1, 2]
    assert all_.stops_s[1] == 3.0
    assert all_.arrives_s[1] == 4.0
    assert all_.entry_line.tolist() == [7, 8]


def test_a_score_without_entries_has_none(make_rig):
    all_, faults = of(made("tempo 60\n", make_rig(1)))
    assert len(all_.fiber) == len(all_.line) == len(faults) == 0
