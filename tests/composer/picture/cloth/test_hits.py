"""Where moves land."""

from dataclasses import replace

import numpy as np
import pytest

from composer.picture.cloth.hits import hits_of, in_view, moved_hits, moved_together, nearest


@pytest.fixture(scope="module")
def tracks(make_piece):
    return make_piece(count=4).tracks


def test_every_move_has_a_hit_where_it_ends(tracks):
    hits = hits_of(tracks)
    assert hits.segment.tolist() == [1, 4, 7, 10]
    assert hits.at_s.tolist() == [4.0] * 4
    assert hits.fiber.tolist() == [0, 1, 2, 3]


def test_the_nearest_hit_is_of_the_same_fiber_and_near_enough(tracks):
    hits = hits_of(tracks)
    assert nearest(hits, 2, 4.05, 0.1) == 2
    assert nearest(hits, 2, 3.95, 0.1) == 2
    assert nearest(hits, 2, 4.3, 0.1) == -1


def test_what_is_in_view_is_cut_in_fibers_and_in_time(tracks):
    hits = hits_of(tracks)
    assert in_view(hits, range(1, 3), 3.0, 5.0, 10).tolist() == [1, 2]
    assert in_view(hits, range(4), 4.5, 8.0, 10).tolist() == []
    assert in_view(hits, range(4), 0.0, 8.0, 3) is None


def test_one_line_of_a_phrase_moves_all_its_instances(tracks):
    lined = replace(tracks, phrase_line=np.array([0, 5, 0, 0, 5, 0, 0, 6, 0, 0, 5, 0], np.int32))
    assert moved_together(lined, 4).tolist() == [1, 4, 10]


def test_a_move_from_another_file_moves_with_its_entry(tracks):
    lined = replace(tracks, line=np.array([0, 9, 0, 0, 9, 0, 0, 8, 0, 0, 8, 0], np.int32))
    assert moved_together(lined, 7).tolist() == [7, 10]


def test_a_move_of_no_line_moves_alone(tracks):
    assert moved_together(tracks, 7).tolist() == [7]


def test_hits_that_would_be_elsewhere_are_told_with_both_instants(tracks):
    times = tracks.time_s.copy()
    times[[2, 5]] += (0.25, 0.0004)
    fiber, here, there = moved_hits(tracks, replace(tracks, time_s=times))
    assert (fiber.tolist(), here.tolist(), there.tolist()) == ([0], [4.0], [4.25])


def test_tracks_of_other_knots_have_no_hits_in_common(tracks, make_piece):
    assert not len(moved_hits(tracks, make_piece(count=3).tracks)[0])
