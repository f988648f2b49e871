"""The table of what front ends and a run say to each other, and its reading."""

import json

import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.engine.process.messages import ASKED, LONGEST_ASKED, RULES, TOLD, Unfit, packed, read, why_not
from player.engine.safety import STATES

VALUES = {"flag": True, "number": 7, "seconds": 1.5, "rule": "go-on", "text": "a", "list": [1], "object": {"a": 1}}


@pytest.mark.parametrize("table", [ASKED, TOLD], ids=["asked", "told"])
def test_every_message_comes_back_as_it_was_said(table):
    for row in table.values():
        fields = {name: VALUES[kind] for name, kind in dict(row.fields).items()}
        line = packed(row.name, **fields)
        assert line.count(b"\n") == 1 and read(line[:-1], table) == (row.name, fields)


@pytest.mark.parametrize(
    "line",
    [
        b"",
        b"{",
        b"[]",
        b"7",
        b"{}",
        b'{"say": 7}',
        b'{"say": "open"}',
        b'{"say": "vent", "more": 1}',
        b'{"say": "jump"}',
        b'{"say": "jump", "to_s": NaN}',
        b'{"say": "jump", "to_s": -1}',
        b'{"say": "jump", "to_s": 1e999}',
        b'{"say": "jump", "to_s": true}',
        b'{"say": "jump", "to_s": "1"}',
        b'{"say": "when_left", "rule": "fly"}',
        b'{"say": "when_left", "rule": ["rest"]}',
        b'{"say": "hold", "down": 1}',
        b"\xff\xfe",
        b"[" * 4000,
        b'{"say": "vent"' + b" " * LONGEST_ASKED + b"}",
    ],
)
def test_what_is_not_exactly_a_row_of_the_table_is_unfit(line):
    with pytest.raises(Unfit):
        read(line, ASKED)


@given(st.binary(max_size=300))
def test_no_bytes_do_more_than_be_unfit(line):
    try:
        name, _ = read(line, ASKED)
    except Unfit:
        return
    assert name in ASKED


@given(st.recursive(st.none() | st.booleans() | st.floats() | st.text(), lambda inner: st.lists(inner), max_leaves=20))
def test_no_value_of_a_field_does_more_than_be_unfit(value):
    line = json.dumps({"say": "play", "from_s": value}).encode()
    try:
        _, fields = read(line, ASKED)
    except Unfit:
        return
    assert fields["from_s"] >= 0.0


def test_whoever_only_watches_can_leave_vent_and_ask_to_command_and_no_more():
    free = {row.name for row in ASKED.values() if not why_not(row, commands=False, state="idle")}
    assert free == {"hello", "vent", "here", "leave", "command"}


def test_a_vent_is_taken_in_every_state_from_everybody():
    assert all(why_not(ASKED["vent"], commands=False, state=state) == "" for state in STATES)


def test_arming_is_for_the_idle_state_alone():
    assert [state for state in STATES if not why_not(ASKED["arm"], commands=True, state=state)] == ["idle"]


def test_every_rule_says_what_becomes_of_the_run():
    assert list(RULES) == ["rest", "go-on"] and all(RULES.values())
