"""Classes of words, of whole and of half-typed lines."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.edits.colouring import CLASSES, block_after, blocks_until, colour_line, colours_of
from composer.score.bounds import most

from .making import DEMOS, text_of


def told(line: str, block: str) -> list[tuple[str, str]]:
    return [(line[start:end], kind) for start, end, kind in colour_line(line, block)]


def test_every_word_of_an_entry_has_its_class():
    assert told("  reeds, hem  flick after 8 canon 1/4 from middle  # one by one", "entry") == [
        ("reeds", "fiber"), (",", "mark"), ("hem", "fiber"), ("flick", "phrase"), ("after", "option"), ("8", "number"),
        ("canon", "option"), ("1/4", "number"), ("from", "word"), ("middle", "word"), ("# one by one", "comment"),
    ]  # fmt: skip


def test_a_number_and_its_unit_are_told_apart():
    assert told("  250ms  12%  settle over 2bars", "move") == [
        ("250", "number"), ("ms", "unit"), ("12", "number"), ("%", "unit"), ("settle", "shape"), ("over", "manner"),
        ("2", "number"), ("bars", "unit"),
    ]  # fmt: skip
    assert ("0.8", "number") in told("  a b ripple 0.8 m/s along x", "entry")


def test_a_statement_its_name_and_its_place():
    assert told('cue "doors" at 9:1 wait', "statement") == [
        ("cue", "statement"), ('"doors"', "text"), ("at", "word"), ("9:1", "place"), ("wait", "word"),
    ]  # fmt: skip
    assert told("keep rhythm", "statement")[0] == ("keep", "statement")
    assert ("keep", "option") in told("section a at 1:1 keep rhythm", "statement")


def test_where_a_line_stops_making_sense_one_word_is_wrong_and_the_rest_is_what_it_looks_like():
    assert told("  3  ful  smooth over 2", "move") == [
        ("3", "number"), ("ful", "wrong"), ("smooth", "shape"), ("over", "manner"), ("2", "number"),
    ]  # fmt: skip


def test_what_is_not_finished_is_not_wrong():
    assert told("  reeds  flick  after", "entry")[-1] == ("after", "option")


def test_indented_lines_follow_the_head_above_them_also_a_misspelt_one():
    assert block_after("phrase p 8", "") == "move"
    assert block_after("secton s at 1:1", "") == "entry"
    assert block_after("  3 full", "move") == "move"
    assert block_after("", "entry") == block_after("# aside", "entry") == "entry"
    assert block_after("tempo 72", "entry") == ""
    lines = ["section s at 1:1", "", "# aside", "  a b", "pin 2:1", "  c d"]
    assert [blocks_until(lines, n) for n in range(1, 7)] == ["statement", "entry", "entry", "entry", "statement", ""]


@pytest.mark.parametrize("name", DEMOS)
def test_in_the_demo_scores_nothing_is_wrong_and_everything_has_a_class(name):
    colours = colours_of(text_of(name))
    for line, classes in zip(colours.lines, colours.classes, strict=True):
        covered = "".join(line[start:end] for start, end, _ in classes)
        assert "".join(covered.split()) == "".join(line.split())
        assert all(kind in CLASSES and kind != "wrong" for _, _, kind in classes)
        assert list(classes) == sorted(classes)


LINES = [
    "phrase p 8",
    "  3 full",
    "section s at 1:1",
    "  a p",
    "",
    "# x",
    "tempo 72",
    "  junk",
    "\ufeffmeter 3/4",
    "\tx",
    '"',
    "a#b",
]


@given(st.lists(st.sampled_from(LINES)), st.lists(st.sampled_from(LINES)))
def test_colours_after_an_edit_are_those_of_the_new_text(before, after):
    old = colours_of("\n".join(before))
    assert colours_of("\n".join(after), old) == colours_of("\n".join(after))


@given(st.text(), st.sampled_from(["statement", "move", "entry", ""]))
def test_no_line_whatever_it_holds_is_more_than_can_be_coloured(line, block):
    last = 0
    for start, end, kind in colour_line(line.replace("\n", " "), block):
        assert last <= start < end <= len(line)
        assert kind in CLASSES
        last = end


@pytest.mark.parametrize("name", DEMOS)
def test_demo_scores_cut_off_anywhere_have_colours_up_to_there(name):
    text, before = text_of(name), None
    for end in range(0, len(text), 7):
        before = colours_of(text[:end], before)
        assert before.lines == tuple(text[:end].split("\n"))


def test_a_line_longer_than_a_score_may_have_is_left_without_classes():
    assert colour_line("x" * (most("line") + 1), "statement") == ()
    assert len(colours_of("\n" * (most("lines") + 50)).lines) == most("lines") + 1
