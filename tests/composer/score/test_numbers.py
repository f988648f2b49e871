"""Numbers as people write them."""

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.score.numbers import Unreadable, write_like, write_place_like, written


@pytest.mark.parametrize(
    ("text", "value", "form", "unit"),
    [
        ("3", Fraction(3), "whole", ""),
        ("0.75", Fraction(3, 4), "decimal", ""),
        ("3/4", Fraction(3, 4), "fraction", ""),
        ("2+1/2", Fraction(5, 2), "mixed", ""),
        ("-2+1/2", Fraction(-5, 2), "mixed", ""),
        ("12%", Fraction(12), "whole", "%"),
        ("0.8 m/s", Fraction(4, 5), "decimal", " m/s"),
        ("250ms", Fraction(250), "whole", "ms"),
    ],
)
def test_a_number_is_read_exactly(text, value, form, unit):
    number = written(text)
    assert (number.value, number.form, number.unit) == (value, form, unit)


@pytest.mark.parametrize(
    "text", ["", "x", "1.", ".5", "1/0", "2+1/0", "1" * 19, "0." + "1" * 19, "1/" + "9" * 5000, "1.2.3", "--1", "١"]
)
def test_what_is_no_number_is_refused(text):
    with pytest.raises(Unreadable):
        written(text)


@pytest.mark.parametrize(
    ("old", "value", "new"),
    [
        ("3", "4", "4"),
        ("3", "7/2", "3.5"),
        ("3", "10/3", "3+1/3"),
        ("3", "1/3", "1/3"),
        ("0.75", "1/2", "0.50"),
        ("0.75", "1/3", "0.333333"),
        ("0.5", "1/8", "0.125"),
        ("3/4", "1/2", "2/4"),
        ("3/4", "5/8", "5/8"),
        ("3/4", "5/4", "5/4"),
        ("3/4", "1", "1"),
        ("2+1/2", "9/4", "2+1/4"),
        ("2+1/2", "1/2", "1/2"),
        ("250ms", "3/10", "300ms"),
        ("1.5s", "2", "2.0s"),
        ("2bars", "5/2", "2.5bars"),
        ("12%", "25/2", "12.5%"),
        ("8mm", "33/4", "8.25mm"),
        ("4Hz", "5", "5Hz"),
        ("0.8 m/s", "-1/2", "-0.5 m/s"),
        ("rest", "7/20", "0.35"),
        ("rest", "0", "rest"),
        ("rest", "1", "full"),
        ("hold", "1", "1"),
    ],
)
def test_a_new_value_takes_the_form_of_the_old(old, value, new):
    assert write_like(old, Fraction(value)) == new


@pytest.mark.parametrize(
    ("old", "bar", "count", "new"),
    [("5:3.5", 5, "17/4", "5:4.25"), ("5:2+1/2", 6, "7/4", "6:1+3/4"), ("5:1", 4, "2", "4:2")],
)
def test_a_place_keeps_the_form_of_its_count(old, bar, count, new):
    assert write_place_like(old, bar, Fraction(count)) == new


def test_a_place_in_seconds_stays_in_seconds():
    assert write_place_like("12.4s", 0, Fraction(0), Fraction(13)) == "13.0s"


whole = st.integers(0, 9999).map(str)
decimal = st.builds("{}.{}".format, whole, st.text("0123456789", min_size=1, max_size=6))
fraction = st.builds("{}/{}".format, whole, st.integers(1, 64))
mixed = st.builds("{}+{}/{}".format, whole, whole, st.integers(1, 64))
numbers = st.one_of(whole, decimal, fraction, mixed)


@given(numbers, st.sampled_from(["", "%", "mm", "deg", "s", "bars", "Hz", " m/s"]))
def test_a_number_rewritten_by_itself_is_left_as_it_stands(text, unit):
    assert write_like(text + unit, written(text + unit).value) == text + unit


@given(numbers, st.integers(0, 10**6).map(lambda n: Fraction(n, 1000)), st.sampled_from(["", "%", "s", "bar"]))
def test_what_was_written_reads_back_as_the_value(text, value, unit):
    new = written(write_like(text + unit, value))
    assert (new.value, new.unit) == (value, unit)


@given(st.one_of(fraction, mixed), st.fractions(0, 100, max_denominator=64))
def test_fractions_give_any_fraction_exactly(text, value):
    new = write_like(text, value)
    assert written(new).value == value
    assert "." not in new
