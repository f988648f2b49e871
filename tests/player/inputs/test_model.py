import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.inputs.model import Control, Stroke
from player.inputs.schema import CURVES

SHARES = st.floats(0.0, 1.0)


@given(SHARES, SHARES, SHARES, st.sampled_from(list(CURVES)))
def test_a_control_s_value_comes_back_from_the_stroke_that_it_asks_for(low, high, value, curve):
    deed = Stroke((0,), low, high, curve)
    if abs(high - low) > 1e-3:
        assert deed.value(deed.stroke(value)) == pytest.approx(value, abs=1e-5)


@pytest.mark.parametrize(("curve", "half"), [("linear", 0.5), ("gentle", 0.25), ("steep", 0.5**0.5)])
def test_the_curves_are_line_square_and_root(curve, half):
    deed = Stroke((0,), 0.2, 0.7, curve)
    assert deed.stroke(0.0) == pytest.approx(0.2)
    assert deed.stroke(0.5) == pytest.approx(0.2 + 0.5 * half)
    assert deed.stroke(1.0) == pytest.approx(0.7)


def test_a_control_is_written_as_a_map_has_it():
    assert str(Control("cc", 21, 1)) == "{ cc = 21, channel = 1 }"
    assert str(Control("bend", 0, 0, 'a "b"')) == '{ bend = true, port = "a \\"b\\"" }'
