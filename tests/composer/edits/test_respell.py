"""One line written anew: the same model as the whole text read again."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.edits.respell import respelled
from composer.score.reading import parse_score

from .making import DEMOS, text_of

SOME = ["  3 full", "  8 0.5 swell over 2", "phrase gather 9", "section ebb at 9:2", "  reeds lean after 4", "tempo 60"]
SOME += ["  3 ful", "junk", "", " section ebb at 9:2", "reeds lean"]


@pytest.mark.parametrize("name", DEMOS)
def test_a_line_written_as_it_was_changes_nothing(name):
    score, _ = parse_score(text_of(name), "s")
    for number, line in enumerate(text_of(name).split("\n"), 1):
        found = respelled(score, number, line)
        assert found is None or found == (score, [])
    assert sum(respelled(score, n, line) is not None for n, line in enumerate(text_of(name).split("\n"), 1)) > 30


@given(st.integers(31, 124), st.sampled_from(SOME))
def test_a_line_written_anew_is_what_reading_the_whole_gives_or_is_left_to_that(number, line):
    text = text_of("estuary")
    score, _ = parse_score(text, "s")
    found = respelled(score, number, line)
    if found is None:
        return
    lines = text.split("\n")
    lines[number - 1] = line
    again, _ = parse_score("\n".join(lines), "s")
    assert found[0] == again


def test_a_number_out_of_range_is_a_fault_of_the_line():
    score, _ = parse_score("phrase p\n  1 full\n", "s")
    _, faults = respelled(score, 2, "  -1 full")
    assert "negative" in faults[0].found
    assert respelled(score, 3, "tempo 3") is None
