import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.faults import Faults
from composer.score.sums import sub_polynomial

from .playing import played, thread


@given(st.lists(st.floats(-3, 3), min_size=6, max_size=6), st.floats(0, 1), st.floats(0, 1), st.floats(0, 1))
def test_a_part_of_a_polynomial_is_the_polynomial_there(powers, start, share, v):
    part = sub_polynomial(np.array([powers]), np.array([start]), np.array([share]))[0]
    assert abs(np.polyval(part[::-1], v) - np.polyval(powers[::-1], start + share * v)) < 1e-9


def test_many_fibers_are_summed_as_each_alone(make_rig, monkeypatch):
    text = (
        "phrase up\n  4 0.5\n  5 rest sudden\nphrase dip\n  0 0.1\n  1 0.2\n  2 rest\nsection a at 1:1\n"
        "  r.* up canon 1/3 times 5 every 7\n  r.3-20 dip after 3 canon 1/7 times 9 every 3/2 add\n"
    )
    rig = make_rig(24)
    whole = played(text, rig)
    monkeypatch.setattr("composer.score.sums.BLOCK", 64)
    parts = played(text, rig)
    for name in ("first", "time_s", "manner", "shape", "line", "phrase_line"):
        assert np.array_equal(getattr(whole, name), getattr(parts, name)), name
    np.testing.assert_allclose(whole.curve, parts.curve, atol=1e-15)


def test_so_many_layers_at_once_that_no_machine_could_sum_them_are_a_fault(make_rig):
    text = "phrase long\n  1000 0.5\n  2000 rest\nsection a at 1:1\n  r.1 long times 100000 every 0.01 add\n"
    with pytest.raises(Faults, match=r"t\.score:5:3: added moves overlap so often"):
        played(text, make_rig(1))


def test_a_sum_is_told_by_the_layer_that_moves_most(make_rig):
    text = (
        "phrase big\n  1 full linear\nphrase small\n  1 0.1 linear\n"
        "section a at 1:1\n  r.1 big\n  r.1 small add\n  r.2 small\n  r.2 big add\n"
    )
    tracks = played(text, make_rig())
    assert thread(tracks, 0).line[0] == 6 and thread(tracks, 1).line[0] == 9
