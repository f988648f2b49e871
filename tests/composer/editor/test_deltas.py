"""Changes of a text, counted as Qt counts."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.editor.deltas import Delta, Units, between, units_in

words = st.text(alphabet=st.sampled_from("ab \nä\U0001f300"), max_size=30)


@given(words, words)
def test_the_change_between_two_texts_makes_one_into_the_other(was, now):
    units, delta = Units(was), between(was, now)
    if delta is None:
        assert was == now
    else:
        units.change(delta)
    assert units.text == now


@given(words, words, words, words)
def test_a_change_between_texts_is_no_longer_than_what_was_changed(head, out, put, tail):
    delta = between(head + out + tail, head + put + tail)
    assert delta is None or (len(delta.put) <= len(put) and delta.out <= units_in(out))


def test_a_character_beyond_the_basic_plane_counts_as_two_units():
    units = Units("a\U0001f300b")
    assert len(units) == 4
    units.change(Delta(3, 1, "c"))
    assert units.text == "a\U0001f300c"


def test_a_change_beyond_the_text_is_refused():
    with pytest.raises(ValueError, match="4 units from 0 on, in a text of 3"):
        Units("abc").change(Delta(0, 4, ""))
