"""One file: blocks by indent, and its bounds."""

import pytest

from composer.score.bounds import BOUNDS, most
from composer.score.reading import parse_score
from composer.score.sheet import read_sheet


def said(text: str) -> list[str]:
    return [f"{fault.where.line}:{fault.where.column} {fault.found}" for fault in read_sheet(text, "s").faults]


def test_an_indented_line_outside_a_block_is_told_of():
    assert said("  3 full\n") == ["1:3 an indented line belongs to a phrase or a section, and none is open here"]
    assert said("phrase p\n  1 full\ntempo 60\n  2 full\n") == [
        "4:3 an indented line belongs to a phrase or a section, and none is open here"
    ]


@pytest.mark.parametrize("gap", ["\n", "\n# a comment\n", "\n   # a comment\n\n", "\n\t\n"])
def test_empty_lines_and_comments_do_not_end_a_block(gap):
    sheet = read_sheet(f"phrase p{gap}  1 full{gap}  2 rest\n", "s")
    assert (len(sheet.phrases[0].lines), sheet.faults) == (2, [])


def test_lines_below_a_misspelt_head_are_read_as_what_was_meant():
    assert said("phrse p\n  1 full\n  2 rset\n") == ["1:1 unknown word 'phrse'", "3:5 unknown word 'rset'"]
    assert said("section s\n  a p\n  a p addd\n") == ["1:10 the line ends here", "3:7 unknown word 'addd'"]


def test_lines_below_what_cannot_be_guessed_are_passed_over():
    assert said("??? p\n  1 full\n  ? ? ?\ntempo 0\n") == ["1:1 '???' cannot stand here", "4:7 '0' is out of range"]


def test_a_line_that_cannot_be_read_costs_only_itself():
    sheet = read_sheet("phrase p\n  1 full\n  2 ???\n  3 rest\n", "s")
    assert [line.offset.value for line in sheet.phrases[0].lines] == [1, 3]
    assert sheet.torn == {"p"}


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("#" * (most("file") + 1), "file"),
        ("é" * (most("file") // 2 + 1), "file"),
        ("\n" * (most("lines") + 1), "lines"),
        ("tempo 60\ngroup a = " + "b" * most("line"), "line"),
    ],
)
def test_passing_a_bound_is_a_fault_that_states_it(text, name):
    assert [fault.found for fault in read_sheet(text, "s").faults] == [f"more than {BOUNDS[name].most} {BOUNDS[name].says}"]


@pytest.mark.parametrize(
    "text", [("#" * 63 + "\n") * (most("file") // 64), "\n" * most("lines"), "group a = " + "b" * (most("line") - 10)]
)
def test_up_to_a_bound_all_is_well(text):
    assert read_sheet(text, "s").faults == []


def test_no_more_faults_are_listed_than_the_bound():
    _, faults = parse_score("?\n" * (most("faults") * 3), "s")
    assert len(faults) <= most("faults") + 1


@pytest.mark.parametrize("digits", [most("digits"), most("digits") + 1])
def test_a_number_has_no_more_digits_in_a_row_than_the_bound(digits):
    found = said("phrase p\n  1 0." + "1" * digits + "\n")
    assert found == ([] if digits == most("digits") else ["2:5 a number has more than 18 digits in a row"])


def test_spans_are_the_text_that_they_name():
    text = 'cue "a # b" at 1:1\nphrase p\n\t 2+1/2   12%  settle   over 1/2 # slow\n'
    sheet = read_sheet(text, "s")
    line = sheet.phrases[0].lines[0]
    for span, written in ((line.offset.span, "2+1/2"), (line.target.span, "12%"), (line.over.span, "1/2"),
                          (line.spans[0][1], "settle"), (sheet.cues[0].spans[0][1], "a # b")):  # fmt: skip
        assert text.split("\n")[span.line - 1][span.column - 1 : span.end - 1] == written
