"""What a word means here."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.edits.hover import explain
from composer.score.words import OPTIONS

from .making import DEMOS, demo, made, text_of

TEXT = """\
tempo 60
tempo 120 at 5:1
cue "go" at 3:2
group two = r.1, r.2
phrase up 4
  2 0.5 smooth
  4 rest over 1
section s at 2:1
  two up after 2
  r.3 up at 6:1 stretch 2 canon 1/4
"""


def told(rig, line: int, word: str, text: str = TEXT):
    row = text.split("\n")[line - 1]
    return explain(text, line, row.index(word) + 1, made(text, rig))


def test_a_place_has_its_seconds_bar_and_count_and_tempo(make_rig):
    hover = told(make_rig(4), 3, "3:2")
    assert hover.lines == ("9.000 s from the start, bar 3 count 2.", "The tempo there: 60.0 counts a minute.", 'Cue "go".')
    assert "120.0 counts" in told(make_rig(4), 10, "6:1").lines[1]


def test_a_place_that_a_bar_does_not_have_is_said_to_be_none(make_rig):
    state = made(TEXT, make_rig(4))
    assert "no count 9" in explain(TEXT.replace("6:1", "6:9"), 10, 14, state).lines[0]


def test_a_fiber_has_its_limits_and_its_channel(make_rig):
    hover = told(make_rig(4, stroke=0.3, fill=0.6, exhaust=0.3), 10, "r.3")
    assert hover.title == "r.3"
    assert hover.lines == (
        "stroke 30.0 % strain, 120 mm (rated)",
        "fills at 200 % of it a second at rest, 200 % at full; all of it in 0.50 s",
        "empties at 100 % of it a second at full, 100 % at rest; all of it in 1.00 s",
        "draws 3.0 mL a full stroke",
        "channel 2 of main",
    )


def test_a_group_has_who_is_in_it_and_their_limits_together(make_rig):
    hover = told(make_rig(4, max_hold_s=2.0), 9, "two")
    assert hover.lines[0] == "2 fibers: r.1 and r.2"
    assert "may stay above half stroke for 2 s" in hover.lines
    assert hover.lines[-1] == "channels 0 to 1 of main"
    assert told(make_rig(4), 4, "two").lines == told(make_rig(4), 9, "two").lines


def test_a_name_that_no_fiber_has_is_said_to_be_none(make_rig):
    hover = explain(TEXT.replace("r.3 up", "q.3 up"), 10, 3, made(TEXT, make_rig(4)))
    assert "No fiber or group" in hover.lines[0]


def test_a_phrase_has_its_length_its_peak_and_who_plays_it(make_rig):
    hover = told(make_rig(4), 9, "up")
    assert hover.lines == (
        "4 counts long; 4.00 s where it is played.",
        "Highest: 0.5 of the stroke.",
        "Played by 3 fibers, in lines 9, 10.",
    )


def test_a_duration_is_so_many_seconds_here(make_rig):
    assert told(make_rig(4), 9, "2").lines == ("2.000 s here.",)
    # At 120 counts a minute and stretched by 2 count 4 comes after 4 s, as it does at 60 and not stretched.
    assert told(make_rig(4), 7, "4").lines == ("4.000 s here.",)
    assert told(make_rig(4), 10, "1/4").lines == ("0.125 s here.",)


def test_a_target_is_so_much_strain_for_who_plays_it(make_rig):
    hover = told(make_rig(4, stroke=0.3), 6, "0.5")
    assert hover.title == "0.5: 0.5 of the stroke"
    assert hover.lines == ("r.1-3: 15.0 % strain, 60 mm, 0.50 of the stroke.",)
    assert "more than it can" in explain(TEXT.replace("0.5", "1.5"), 6, 5, made(TEXT, make_rig(4))).lines[0]


def test_a_percentage_that_is_more_strain_than_can_be_is_told_how_a_share_of_the_stroke_is_written(make_rig):
    text = TEXT.replace("0.5", "70%")
    assert explain(text, 6, 5, made(text, make_rig(4))).lines[-1] == (
        "% is strain, a change of length; 70 % of the stroke is written 0.7."
    )
    little = TEXT.replace("0.5", "5%")
    assert "is written" not in explain(little, 6, 5, made(little, make_rig(4))).lines[-1]


@pytest.mark.parametrize("option", sorted(OPTIONS))
def test_an_option_is_explained_by_its_own_sentence(make_rig, option):
    tails = {"ripple": "1 m/s along x", "scatter": "1 seed 2", "add": "", "mirror": "", "retrograde": "", "at": "2:1"}
    text = f"section s at 1:1\n  a b {option} {tails.get(option, '2')}\n"
    hover = explain(text, 2, 8)
    assert hover.title == OPTIONS[option].form
    assert hover.lines[0].lower() == OPTIONS[option].says.lower() + "."


def test_a_comment_a_blank_and_what_is_outside_mean_nothing():
    state = demo("estuary")
    for line, column in ((1, 5), (4, 1), (0, 1), (9999, 1), (33, 60)):
        assert explain(text_of("estuary"), line, column, state) is None


def test_between_two_words_that_touch_the_second_is_explained(make_rig):
    text = TEXT.replace("r.1, r.2", "r.1,r.2")
    assert explain(text, 4, 17, made(text, make_rig(4))).title == "r.2"


@pytest.mark.parametrize("name", DEMOS)
def test_every_word_of_the_demo_scores_can_be_asked_about(name):
    text, state = text_of(name), demo(name)
    for number, line in enumerate(text.split("\n"), 1):
        for column in range(1, len(line) + 2):
            hover = explain(text, number, column, state)
            if hover is not None:
                assert hover.start <= column <= hover.end <= len(line) + 1
                assert hover.title
                assert all(hover.lines)


@pytest.mark.parametrize("name", DEMOS)
def test_demo_scores_cut_off_anywhere_never_fail(name):
    text, state = text_of(name), demo(name)
    for end in range(0, len(text) + 1, 3):
        cut = text[:end]
        explain(cut, cut.count("\n") + 1, len(cut) - cut.rfind("\n"), state)
        explain(cut, cut.count("\n") + 1, len(cut) - cut.rfind("\n") - 1)


@given(st.text(max_size=30), st.integers(-1, 4), st.integers(-2, 40))
def test_no_text_and_no_place_is_more_than_can_be_asked_about(text, line, column):
    hover = explain(text, line, column, demo("gannet"))
    assert hover is None or hover.title
