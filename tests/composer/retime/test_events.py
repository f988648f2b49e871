"""From tracks to hits and free starts."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.retime.events import events_of, strain_gone, with_waits
from composer.retime.stage import durations_to_keep

from .scores import tracks_of


def events(make_rig, fibers, firm=None):
    tracks, _ = with_waits(tracks_of(fibers))
    abilities = abilities_of(make_rig(len(fibers)))
    return events_of(tracks, abilities, durations_to_keep(tracks, abilities), firm)


def test_arrivals_at_one_instant_are_one_hit(make_rig):
    one = [(0.0, 0.3, "smooth"), (1.0, 0.0, "linear"), (2.0, None, "end")]
    other = [(0.0, 0.15, "linear"), (1.0 + 5e-10, None, "hold"), (1.5, 0.3, "linear"), (2.0, None, "end")]
    found = events(make_rig, [one, other])
    assert found.hits == 2
    assert found.written_s[:2].tolist() == [1.0, 2.0]
    assert found.weight[:2] == pytest.approx([1.5, 1.5])


def test_a_start_after_a_hold_is_the_fibers_own_even_where_others_land(make_rig):
    landing = [(0.0, 0.3, "linear"), (1.0, None, "end")]
    starting = [(0.0, None, "hold"), (1.0, 0.3, "linear"), (2.0, None, "end")]
    found = events(make_rig, [landing, starting])
    assert found.hits == 2 and len(found.written_s) == 3
    assert found.weight[2] == pytest.approx(1.0 / 20.0)
    assert found.own_hit[2] == 1


def test_a_start_at_the_start_of_the_score_does_not_move(make_rig):
    found = events(make_rig, [[(0.0, 0.3, "linear"), (1.0, None, "end")]])
    assert found.event.tolist() == [-1, 0]


def test_a_sudden_start_hangs_from_its_hit(make_rig):
    found = events(make_rig, [[(0.0, None, "hold"), (1.0, 0.3, "sudden"), (1.5, None, "end")]])
    assert found.event.tolist() == [-1, 0, 0]
    assert found.offset_s == pytest.approx([0.0, -0.5, 0.0])


def test_a_sudden_move_after_a_move_gets_a_hold_of_no_length_to_wait_in():
    tracks, origin = with_waits(tracks_of([[(0.0, 0.1, "linear"), (1.0, 0.3, "sudden"), (2.0, None, "end")]]))
    assert tracks.manner.tolist() == [1, 0, 2, 0]
    assert tracks.time_s.tolist() == [0.0, 1.0, 1.0, 2.0]
    assert origin.tolist() == [0, 1, 1, 2]
    assert tracks.curve[1].tolist() == pytest.approx([0.1, 0, 0, 0, 0, 0])


def test_moves_without_length_land_one_after_another(make_rig):
    found = events(make_rig, [[(0.0, 0.3, "linear"), (0.0, 0.0, "linear"), (0.0, None, "end")]])
    assert found.hits == 2
    assert np.array_equal(found.place, [0, 1])


def test_a_move_back_and_forth_weighs_all_the_strain_that_it_goes_through():
    tracks = tracks_of([[(0.0, 0.3, "linear"), (1.0, None, "end")]])
    tracks.curve[0] = [0.0, 4.0, -4.0, 0.0, 0.0, 0.0]
    tracks.shape[0] = -1
    assert strain_gone(tracks)[0] == pytest.approx(2.0)


def test_firm_moves_weigh_as_many_times_more(make_rig):
    fibers = [[(0.0, None, "hold"), (1.0, 0.3, "linear"), (2.0, None, "end")]]
    assert events(make_rig, fibers, np.array([1.0, 5.0, 1.0])).weight == pytest.approx([5.0, 5.0 / 20.0])
