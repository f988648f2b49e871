"""The lanes below the cloth."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from composer.picture.cloth.lanes import bends


@given(values=st.lists(st.floats(0.0, 50.0), min_size=1, max_size=200))
def test_a_line_through_the_bends_alone_is_the_line_through_all_points(values):
    y = np.array(values)
    kept = bends(y)
    assert (kept[0], kept[-1]) == (0, len(y) - 1)
    again = np.interp(np.arange(len(y)), kept, y[kept])
    # Each point left out bends by less than a fiftieth of a pixel; many of them on end may add up to little more.
    apart = np.abs(again - y)
    assert apart.max() <= 0.02 * max(np.diff(kept).max(initial=1), 1) ** 2 / 8 + 1e-9


def test_a_straight_line_has_two_ends_and_nothing_between():
    assert bends(np.linspace(3.0, 40.0, 500)).tolist() == [0, 499]


def test_a_step_keeps_both_its_corners():
    assert bends(np.array([0.0, 0.0, 0.0, 9.0, 9.0, 9.0])).tolist() == [0, 2, 3, 5]
