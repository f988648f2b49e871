"""The headings of what a window shows."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.picture.cloth.heading import columns
from composer.picture.scene import Lane


def lane(values, supply=False):
    return Lane("lane", "%", np.asarray(values, float), 0.0, 1.0, "duty", supply=supply)


@given(values=st.lists(st.floats(0.0, 1.0), min_size=4, max_size=400), width=st.integers(1, 300))
def test_zoomed_out_the_worst_of_all_is_still_shown_and_nothing_worse(values, width):
    shown = columns(lane(values), 10.0, 0.0, 10.0, width).values
    assert shown.max() == max(values)
    least = columns(lane(values, supply=True), 10.0, 0.0, 10.0, width).values
    assert least.min() == min(values)


def test_the_last_column_shows_no_more_than_its_own_stretch():
    values = np.concatenate([np.zeros(500), np.ones(500)])
    assert columns(lane(values), 10.0, 0.0, 4.9, 100).values.max() == 0.0


def test_zoomed_in_each_column_shows_where_it_lies():
    shown = columns(lane([0.0, 1.0, 0.0, 1.0]), 8.0, 2.0, 6.0, 40).values
    assert shown.tolist() == [1.0] * 20 + [0.0] * 20


def test_beyond_the_score_there_is_nothing():
    shown = columns(lane([0.5, 0.5]), 2.0, 0.0, 4.0, 40).values
    assert np.isnan(shown).tolist() == [False] * 20 + [True] * 20


def test_what_it_means_stays(make_weave):
    one = make_weave().lanes[0]
    shown = columns(one, 8.0, 0.0, 8.0, 100)
    assert (shown.name, shown.unit, shown.limit, shown.supply) == (one.name, one.unit, one.limit, True)
    assert shown.values == pytest.approx(one.values[::4], abs=0.5)
