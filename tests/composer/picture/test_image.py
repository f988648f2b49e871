"""Threads as pixels."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.picture import image, palette
from composer.picture.bands import Band
from composer.shapes import PROGRESS
from composer.tracks import HOLD, MOVE, Tracks

RISE = Tracks(
    np.array([0, 3, 4]),
    np.array([0.0, 1.0, 2.0, 0.0]),
    np.array([np.zeros(6), 0.3 * PROGRESS["linear"], 0.3 * np.eye(6)[0], np.zeros(6)]),
    np.array([HOLD, MOVE, HOLD, HOLD], np.int8),
    *(np.zeros(4, dtype) for dtype in (np.int8, np.int32, np.int32)),
    3.0,
)


def test_pixels_of_a_known_track_are_the_colours_of_its_strain(make_rig):
    abilities = abilities_of(make_rig(2))
    times = image.column_times(0.0, 3.0, 6)
    assert times.tolist() == [0.25, 0.75, 1.25, 1.75, 2.25, 2.75]
    share = image.shares(RISE, abilities, times)
    assert share[0] == pytest.approx([0, 0, 0.25, 0.75, 1, 1])
    rows = image.rows_of([Band("a", 0, 2)], 2)
    drawn = image.threads(share, image.extends(abilities), rows)
    steps = [0, 0, 64, 191, 255, 255]
    assert drawn[0].tolist() == palette.CONTRACT[steps].tolist()
    assert drawn[1].tolist() == [palette.CONTRACT[0].tolist()] * 6


def test_an_extending_fiber_has_the_other_hue():
    drawn = image.colours(np.array([[1.0], [1.0]]), np.array([False, True]))
    assert drawn[:, 0].tolist() == [palette.CONTRACT[-1].tolist(), palette.EXTEND[-1].tolist()]


def test_beyond_rest_and_full_the_colour_is_that_of_the_end():
    drawn = image.colours(np.array([[-3.0, 7.0, np.nan]]), np.array([False]))
    assert drawn[0].tolist() == palette.CONTRACT[[0, -1, 0]].tolist()


def test_between_bands_there_is_ground(make_rig):
    rows = image.rows_of([Band("a", 0, 1), Band("b", 1, 3)], 60)
    drawn = image.threads(np.ones((3, 1)), np.zeros(3, bool), rows)
    gap = drawn[int(rows.bottom[0]) : int(rows.top[1]), 0]
    assert len(gap) >= 2
    assert np.all(gap == palette.GROUND)


@given(sizes=st.lists(st.integers(1, 40), min_size=1, max_size=12), height=st.integers(1, 800))
def test_threads_lie_in_order_within_the_height_and_never_over_one_another(sizes, height):
    edges = np.concatenate([[0], np.cumsum(sizes)])
    rows = image.rows_of([Band("x", int(a), int(b)) for a, b in pairwise(edges)], height)
    assert rows.height <= height
    assert np.all(rows.bottom - rows.top > 0.0)
    assert np.all(rows.top[1:] >= rows.bottom[:-1] - 1e-6)
    assert rows.bottom[-1] <= rows.height + 1e-6


def test_more_threads_than_pixels_show_their_mean():
    rows = image.rows_of([Band("x", 0, 400)], 100)
    assert rows.crowded
    share = np.tile([[0.0], [0.0], [1.0], [1.0]], (100, 1))
    drawn = image.threads(share, np.zeros(400, bool), rows)
    mean = (palette.CONTRACT[0].astype(float) + palette.CONTRACT[-1]) / 2
    assert drawn[:, 0] == pytest.approx(np.tile(mean, (100, 1)), abs=1.0)


def test_in_a_crowd_just_above_the_pixels_there_is_no_row_without_a_thread():
    rows = image.rows_of([Band("x", 0, 105)], 100)
    drawn = image.threads(np.ones((105, 1)), np.zeros(105, bool), rows)
    assert np.all(drawn == palette.CONTRACT[-1])


def test_a_rig_without_fibers_is_an_image_without_rows():
    assert image.threads(np.zeros((0, 5)), np.zeros(0, bool), image.rows_of([], 50)).shape == (0, 5, 3)
