import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.wire.values import OutOfRange, clip, from_wire, to_wire


def test_rest_is_zero_and_full_is_65535():
    assert to_wire([0.0, 1.0], False).tolist() == [0, 65535]


def test_a_valve_is_shut_at_32768_fills_at_65535_and_exhausts_at_0():
    assert to_wire([-1.0, 0.0, 1.0], True).tolist() == [0, 32768, 65535]
    assert from_wire([0, 32768, 65535], True).tolist() == [-1.0, 0.0, 1.0]


def test_drives_may_be_mixed():
    assert to_wire([0.5, 0.5, -0.5], [False, True, True]).tolist() == [32768, 49152, 16384]


@pytest.mark.parametrize("valve", [False, True])
def test_every_number_comes_back_as_itself(valve):
    numbers = np.arange(65536)
    assert (to_wire(from_wire(numbers, valve), valve) == numbers).all()


@given(st.floats(0.0, 1.0), st.booleans())
def test_a_value_is_rounded_to_the_nearest_number(value, valve):
    step = 1.0 / (32767 if valve else 65535)
    assert abs(float(from_wire(to_wire([value], valve), valve)[0]) - value) <= 0.5 * step * (1 + 1e-9)


@pytest.mark.parametrize(
    ("value", "valve"), [(1.0000001, False), (-1e-9, False), (np.nan, False), (np.inf, True), (-1.001, True)]
)
def test_a_value_out_of_range_is_refused_by_its_place_and_never_clipped_in_silence(value, valve):
    with pytest.raises(OutOfRange, match="at place 1; expected 0 to 1, or -1 to 1 for a valve") as refused:
        to_wire([0.0, value], valve)
    assert refused.value.indices.tolist() == [1]


def test_clipping_says_where_it_changed_something():
    kept, changed = clip([0.2, -0.5, -0.5, 3.0, np.nan], [False, False, True, True, True])
    assert kept.tolist() == [0.2, 0.0, -0.5, 1.0, 0.0]
    assert changed.tolist() == [False, True, False, True, True]


def test_of_several_values_out_of_range_the_first_is_named_and_the_others_are_counted():
    with pytest.raises(OutOfRange, match="drive value 2 at place 1, and 2 more; expected"):
        to_wire([0.0, 2.0, -1.0, 0.5, 3.0], False)
