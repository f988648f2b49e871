"""How the room is seen."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.picture.hang.camera import VIEWS, Camera, depth, fitted, scale_bar, turned

NUMBERS = st.floats(-10.0, 10.0)
POINTS = st.lists(st.tuples(NUMBERS, NUMBERS, NUMBERS), min_size=1, max_size=20)


def test_from_the_front_x_is_to_the_right_and_z_up():
    assert turned([[1.0, 5.0, 2.0]], VIEWS["front"])[0] == pytest.approx([1.0, 2.0])


def test_from_the_side_what_is_at_the_back_is_to_the_right():
    assert turned([[5.0, 1.0, 2.0]], VIEWS["side"])[0] == pytest.approx([1.0, 2.0])


def test_three_quarter_sees_the_front_the_side_and_the_top():
    seen = turned(np.eye(3), VIEWS["three-quarter"])
    x, y, z = seen
    assert x[0] > 0.5
    assert y[0] > 0.2
    assert y[1] > 0.0
    assert z[1] > 0.8


@pytest.mark.parametrize("view", VIEWS.values(), ids=lambda view: view.name)
@given(points=POINTS)
def test_every_view_is_a_turn_so_what_is_seen_and_how_far_it_lies_keep_all_lengths(view, points):
    points = np.array(points)
    seen = np.column_stack([turned(points, view), depth(points, view)])
    assert np.linalg.norm(seen, axis=1) == pytest.approx(np.linalg.norm(points, axis=1), abs=1e-9)


def test_what_is_farther_back_is_deeper():
    assert depth([[0.0, 1.0, 0.0]], VIEWS["front"])[0] > 0.0
    assert depth([[-1.0, 0.0, 0.0]], VIEWS["side"])[0] > 0.0


@pytest.mark.parametrize("view", VIEWS.values(), ids=lambda view: view.name)
@given(points=POINTS)
def test_a_fitted_camera_has_every_point_in_its_box(view, points):
    pixels = fitted(np.array(points), view, 30.0, 40.0, 600.0, 300.0).pixels(points)
    assert (pixels >= np.array([30.0, 40.0]) - 1e-6).all()
    assert (pixels <= np.array([630.0, 340.0]) + 1e-6).all()


def test_zooming_keeps_the_pixel_under_the_pointer():
    camera = Camera(VIEWS["front"], 100.0, 200.0, 50.0)
    point = np.array([[2.0, 0.0, 1.0]])
    x, y = camera.pixels(point)[0]
    near = camera.zoomed(3.0, x, y)
    assert near.pixels(point)[0] == pytest.approx([x, y])
    assert near.scale == 150.0


@given(st.floats(0.5, 1e6), st.floats(20.0, 400.0))
def test_the_scale_bar_is_1_2_or_5_of_a_unit_and_as_long_as_it_can_be(scale, most):
    length, words = scale_bar(scale, most)
    assert length * scale <= most * (1 + 1e-9)
    assert length * scale > most / 2.6
    digit = length / 10.0 ** np.floor(np.log10(length) + 1e-9)
    assert min(abs(digit - each) for each in (1.0, 2.0, 5.0)) < 1e-6
    number, unit = words.split()
    assert float(number) * {"m": 1.0, "cm": 0.01, "mm": 0.001}[unit] == pytest.approx(length)
