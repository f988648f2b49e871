import pytest

from composer.faults import Fault
from composer.score.expand_lines import HELD, Lines, phrase_lines
from composer.score.reading import parse_score
from composer.shapes import NAMES


def table(text: str, *wanted: tuple[str, bool]) -> tuple[Lines, list[Fault]]:
    faults: list[Fault] = []
    return phrase_lines(parse_score(text, "t.score")[0], list(wanted), faults), faults


def test_offsets_keep_their_units_as_parts():
    lines, _ = table("phrase p 9\n  1 full\n  2.5s rest\n  3bars hold\n", ("p", False))
    assert lines.offset.tolist() == [[0, 1, 0], [0, 0, 2.5], [3, 0, 0]]
    assert lines.length.tolist() == [[0, 9, 0]]
    assert lines.unit.tolist()[-1] == HELD


def test_a_length_that_is_not_declared_is_the_last_line_s_offset():
    assert table("phrase p\n  1 full\n  2500ms rest\n", ("p", False))[0].length.tolist() == [[0, 0, 2.5]]


def test_variants_stand_end_to_end():
    text = "phrase p\n  0 rest\n  1 full\nphrase q\n  2 full\n"
    lines, _ = table(text, ("q", False), ("p", True), ("p", False))
    assert lines.first.tolist() == [0, 1, 3, 5]
    assert lines.value.tolist() == [1, 1, 0, 0, 1]
    assert lines.phrase_line.tolist() == [5, 3, 3, 2, 3]


def test_backwards_a_held_target_is_the_one_that_was_held():
    lines, _ = table("phrase p\n  0 0.2\n  1 0.7\n  3 hold\n  4 rest swell\n", ("p", True))
    assert lines.value.tolist() == [0.0, 0.7, 0.7, 0.2]
    assert lines.offset[:, 1].tolist() == [0, 1, 3, 4]
    assert [NAMES[shape] for shape in lines.shape][1] == "settle"


def test_backwards_the_control_values_of_a_curve_are_turned_round():
    lines, _ = table("phrase p\n  0 rest\n  1 full curve 0.1 0.2 0.3 0.4\n", ("p", True))
    assert lines.control[1].tolist() == [0.4, 0.3, 0.2, 0.1]


def test_a_sudden_move_backwards_has_all_the_time_to_the_line_it_leads_into():
    lines, _ = table("phrase p\n  0 rest\n  8 full sudden over 2\n", ("p", True))
    assert not lines.has_lasts[1] and lines.offset[1, 1] == 8


@pytest.mark.parametrize("phrase", ["phrase p\n  1 full\n", "phrase p\n  0 hold\n  1 full\n"])
def test_a_phrase_with_nothing_to_end_on_cannot_run_backwards(phrase):
    _, faults = table(phrase, ("p", True))
    assert [fault.where.line for fault in faults] == [2] and "nothing to end on" in faults[0].found
