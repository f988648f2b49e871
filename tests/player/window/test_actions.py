"""What can be done when, and why not."""

import pytest

from player.engine.process.messages import ASKED
from player.engine.safety import STATES
from player.window.actions import (
    ACTIONS,
    BY_KEY,
    NO_HANDS,
    NOT_SO,
    WATCHES,
    Standing,
    message_of,
    sheet,
    why_not_now,
    word_of,
    words_of,
)
from player.window.preflight_view import PreflightView

COMMANDS = Standing(stage="running", state="playing", commands=True, taken=True, marks=True)


def test_every_action_that_asks_is_a_message_of_the_run():
    assert all(row.asks in ASKED for row in ACTIONS.values() if row.asks)


def test_no_key_has_two_meanings():
    assert len(BY_KEY) == sum(len(row.keys) for row in ACTIONS.values())


def test_vent_is_possible_in_every_state_and_for_whoever_watches():
    for stage in ("before", "running"):
        for state in STATES:
            assert why_not_now("vent", Standing(stage, state, commands=False, taken=True)) == ""


@pytest.mark.parametrize("state", STATES)
@pytest.mark.parametrize("stage", ["before", "running"])
def test_whoever_watches_can_do_nothing_else_and_is_told_why(stage, state):
    watches = Standing(stage, state, commands=False, taken=True, marks=True, live=True, takes=True, holds=True)
    for name, row in ACTIONS.items():
        if row.asks and name != "vent":
            assert why_not_now(name, watches) == WATCHES, name


def test_nothing_is_armed_before_the_preflight_is_in_order():
    before = Standing(stage="before", commands=True, taken=True)
    assert "not done yet" in why_not_now("arm", before)
    assert why_not_now("arm", Standing(stage="before", commands=True, taken=True, marks=False)) == NOT_SO
    assert why_not_now("arm", Standing(stage="before", commands=True, taken=True, marks=True)) == ""


def test_space_plays_pauses_and_goes_on_as_the_state_has_it():
    says = {state: message_of("turn", Standing("running", state)) for state in ("armed", "playing", "paused")}
    assert says == {"armed": "play", "playing": "pause", "paused": "go_on"}


def test_arming_again_after_a_vent_brings_everything_back():
    vented = Standing("running", "vented", commands=True, taken=True, marks=True)
    assert message_of("arm", vented) == "bring_back" and why_not_now("arm", vented) == ""
    assert why_not_now("arm", COMMANDS) == "it is armed already"


def test_what_only_hands_need_says_so_for_a_score_alone():
    assert why_not_now("record", COMMANDS) == NO_HANDS and why_not_now("let_go", COMMANDS) == NO_HANDS


def test_each_action_is_offered_in_just_the_states_that_the_runs_table_has_for_it():
    for name in ("pause", "go_on", "next_cue", "rest", "jump", "play"):
        for state in STATES:
            now = Standing("running", state, commands=True, taken=True, marks=True)
            asks = message_of(name, now)
            if not why_not_now(name, now):
                assert state in ASKED[asks].states, (name, state)


def test_the_sheet_has_every_key():
    assert {key for keys, _, _ in sheet() for key in keys.split(" or ")} == set(BY_KEY)


def test_a_button_bears_one_of_the_words_it_is_made_wide_for():
    every = [Standing(stage, state, commands=True) for stage in ("before", "running") for state in STATES]
    for name in ACTIONS:
        assert {word_of(name, now) for now in every} <= set(words_of(name))
    assert len(words_of("arm")) == 2 == len(words_of("jump"))


def test_a_row_of_the_preflight_that_changes_leaves_those_before_it_as_they_are(qapp):
    view = PreflightView()
    rows = [
        ("ok", "the board answers", ""),
        ("no", "it serves this rig", "give it the rig file"),
        ("margin", "10 %", ""),
    ]
    view.show_rows(rows)
    first = view.item(0)
    view.show_rows([*rows[:2], ("margin", "20 %", ""), ("margin", "30 %", "")])
    assert view.item(0) is first and [view.item(row).text()[-4:] for row in (2, 3)] == ["20 %", "30 %"]
    view.show_rows(rows[:1])
    assert view.count() == 1 and view.item(0) is first
    view.show_rows([])
    assert view.count() == 0
