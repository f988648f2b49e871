"""From a knot to the number in the text that gives it, and back."""

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.score.numbers import write_like
from composer.score.reading import read_score
from composer.score.spans import (
    find,
    gives_target,
    gives_time,
    players,
    rewrite,
    rewrite_all,
    set_value,
    span_of,
    target_handles,
    text_at,
    time_handles,
)

TEXT = """\
tempo 72   # brisk
phrase gather 8
  0      rest
  2+1/2  60%     smooth   # the crest
  8      rest    settle over 250ms
phrase bow
  1.50   3/4  curve 0.1 0.2 0.5 0.7 quiver 4Hz by 0.05
section ebb at 2:3.5 times 2 every 8bars firm 2
  reeds  gather after 1/2 canon 1/4 from end scale 0.50 stretch 3/2
  reeds  bow    at 5:2+1/2 ripple 0.8 m/s along x scatter 1/8 seed 7 times 4 every 8 add
  hem    gather
"""


def handles(text: str = TEXT):
    score = read_score(text, "s")
    found = [find(score, 9, 4), find(score, 9, 5), find(score, 10, 7), find(score, 11, 3)]
    return [handle for one in found for handle in (*time_handles(one), *target_handles(one))]


def shown(found) -> dict[str, str]:
    return {handle.role: text_at(TEXT, handle.span) for handle in found}


def test_a_knot_has_its_time_and_target_from_its_phrases_line():
    found = find(read_score(TEXT, "s"), 9, 4)
    assert text_at(TEXT, gives_time(found).span) == "2+1/2"
    assert text_at(TEXT, gives_target(found).span) == "60%"


def test_every_number_that_has_a_say_in_when_is_named_nearest_first():
    score = read_score(TEXT, "s")
    assert list(shown(time_handles(find(score, 9, 5))).items()) == [
        ("offset", "8"),
        ("after", "1/2"),
        ("section at", "2:3.5"),
        ("over", "250ms"),
        ("stretch", "3/2"),
        ("canon", "1/4"),
        ("section every", "8bars"),
    ]
    assert list(shown(time_handles(find(score, 10, 7))).items()) == [
        ("offset", "1.50"),
        ("at", "5:2+1/2"),
        ("section at", "2:3.5"),
        ("ripple", "0.8 m/s"),
        ("scatter", "1/8"),
        ("every", "8"),
        ("section every", "8bars"),
    ]


def test_every_number_that_has_a_say_in_how_far_is_named():
    score = read_score(TEXT, "s")
    assert shown(target_handles(find(score, 9, 4))) == {"target": "60%", "scale": "0.50"}
    assert list(shown(target_handles(find(score, 10, 7))).values()) == ["3/4", "0.1", "0.2", "0.5", "0.7", "0.05"]


def test_a_phrase_from_another_file_is_found_by_the_index_of_its_line():
    score = read_score("use w.score\nsection s at 2:1\n  a p after 3\n", "s", lambda path: "phrase p\n  1 full\n  2 rest\n")
    assert find(score, 3).line is None
    assert gives_time(find(score, 3)).role == "after"
    assert gives_target(find(score, 3)) is None
    assert find(score, 3, index=1).line.offset.value == 2


def test_where_no_entry_stands_nothing_is_found():
    score = read_score(TEXT, "s")
    assert [line for line in range(13) if find(score, line)] == [9, 10, 11]


def test_all_who_play_a_phrase_are_named():
    assert players(read_score(TEXT, "s"), "gather") == (9, 11)


def test_words_and_names_have_spans_too():
    score = read_score(TEXT, "s")
    assert text_at(TEXT, span_of(score.phrases["bow"], "name")) == "bow"
    assert text_at(TEXT, span_of(score.sections[0].entries[0], "canon")) == "canon"
    assert text_at(TEXT, span_of(score.sections[0].entries[0].canon, "origin")) == "end"
    assert text_at(TEXT, span_of(score.sections[0], "firm number")) == "2"
    assert text_at(TEXT, span_of(score.tempi[0], "rate")) == "72"
    assert span_of(score.tempi[0], "to") is None


def test_every_handle_shows_the_number_that_it_stands_for():
    for handle in handles():
        if handle.unit == "place":
            assert text_at(TEXT, handle.span).startswith(f"{handle.bar}:")
        else:
            assert set_value(TEXT, handle, handle.value) == TEXT


@pytest.mark.parametrize("ending", ["\n", "\r\n"])
def test_every_number_rewritten_by_itself_leaves_the_text_as_it_was(ending):
    text = TEXT.replace("\n", ending)
    for handle in handles(text):
        assert set_value(text, handle, handle.value) == text
        assert rewrite(text, handle.span, text_at(text, handle.span)) == text


COUNT = len(handles())


@given(st.integers(0, COUNT - 1), st.integers(1, 3000).map(lambda n: Fraction(n, 1000)), st.integers(1, 9))
def test_a_rewritten_number_changes_its_span_alone_and_reads_back_as_the_new_value(which, value, bar):
    old = handles()[which]
    if old.unit == "place":
        value = 1 + value / 2
    new = set_value(TEXT, old, value, bar)
    changed = [n for n, (a, b) in enumerate(zip(TEXT.split("\n"), new.split("\n"), strict=True), 1) if a != b]
    assert changed in ([], [old.span.line])
    before, after = TEXT.split("\n")[old.span.line - 1], new.split("\n")[old.span.line - 1]
    tail = before[old.span.end - 1 :]
    assert after.startswith(before[: old.span.column - 1])
    assert after.endswith(tail)
    written = after[old.span.column - 1 : len(after) - len(tail)]
    if old.unit == "place":
        assert written == f"{bar}:" + write_like(text_at(TEXT, old.span).partition(":")[2], value)
    else:
        assert written == write_like(text_at(TEXT, old.span), value)
    again = _same_place(new, old)
    assert (again.value, again.bar) == (value, bar if old.unit == "place" else 0)


def _same_place(text: str, old):
    """The handle of the rewritten text at the old one's place; faults of order or length do not hide it."""
    from composer.score.reading import parse_score

    score, _ = parse_score(text, "s")
    for line, phrase_line in ((9, 4), (9, 5), (10, 7), (11, 3)):
        found = find(score, line, phrase_line)
        for handle in (*time_handles(found), *target_handles(found)):
            if (handle.role, handle.span.line, handle.span.column) == (old.role, old.span.line, old.span.column):
                return handle
    raise AssertionError(f"{old} is gone from\n{text}")


def test_several_spans_are_rewritten_at_once_in_any_order():
    score = read_score(TEXT, "s")
    lines = score.phrases["gather"].lines
    changes = [(lines[1].offset.span, "3"), (lines[1].target.span, "full"), (score.tempi[0].spans[0][1], "100")]
    assert rewrite_all(TEXT, changes) == rewrite_all(TEXT, reversed(changes))
    assert "  3  full     smooth   # the crest\n" in rewrite_all(TEXT, changes)
