"""Edits made and taken back."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.edits.edit import apply, change_at, edit_of, inverse, line_starts, lines_after, no_moves
from composer.score.model import Span


@st.composite
def texts_and_changes(draw):
    text = draw(st.text(max_size=60))
    cuts = sorted(draw(st.lists(st.integers(0, len(text)), max_size=8)))
    pairs = list(zip(cuts[::2], cuts[1::2], strict=False))
    return text, [(start, end, draw(st.text(max_size=5))) for start, end in pairs]


@given(texts_and_changes())
def test_an_edit_and_its_inverse_give_the_same_text(case):
    text, changes = case
    edit = edit_of(changes, "some")
    new = apply(text, edit)
    back = inverse(text, edit)
    assert apply(new, back) == text
    assert apply(apply(new, back), inverse(new, back)) == new


@given(texts_and_changes())
def test_changes_are_the_same_in_any_order(case):
    text, changes = case
    assert apply(text, edit_of(changes, "a")) == apply(text, edit_of(sorted(changes, reverse=True), "b")) or len(
        {start for start, _, _ in changes}
    ) < len(changes)


def test_changes_that_overlap_are_refused():
    with pytest.raises(ValueError, match="overlap"):
        edit_of([(0, 4, "a"), (3, 5, "b")], "bad")


def test_a_span_of_the_model_is_a_change_of_the_whole_text():
    text = "meter 4/4\r\ntempo 72\n"
    assert line_starts(text) == [0, 11, 20]
    assert apply(text, edit_of([change_at(text, Span("s", 2, 7, 9), "96")], "faster")) == "meter 4/4\r\ntempo 96\n"


def test_an_edit_that_moves_nothing_says_so_in_empty_arrays():
    assert len(no_moves().fiber) == len(no_moves().places_s) == 0


def test_the_lines_that_an_edit_has_written_are_told_as_they_stand_afterwards():
    text = "one\ntwo\nthree\nfour\n"
    edit = edit_of([(0, 3, "1"), (8, 8, "new\nnewer\n"), (14, 18, "4")], "some")
    new = apply(text, edit)
    assert new.split("\n")[:6] == ["1", "two", "new", "newer", "three", "4"]
    assert lines_after(new, edit.changes, 10) == [1, 3, 4, 6]
    assert lines_after(new, edit.changes, 1) == [1]
    below = edit_of([(3, 3, "\nunder one")], "some")
    assert lines_after(apply(text, below), below.changes, 10) == [2]
    gone = edit_of([(4, 8, "")], "some")
    assert lines_after(apply(text, gone), gone.changes, 10) == [2]
