"""Rows of the table of faults in which the operator vents, or stops, in each state: on a terminal, by real keys."""

import signal

import pytest

from player.engine.fault_table import OPERATOR

KEYS = {"vent": b"v", "stop": b"\x03"}
ARM = "Type 'arm'"


def playing(stage):
    return stage.terminal("--arm").see("playing  bar 1:1")


def paused(stage):
    return playing(stage).type(b" ").see("paused  bar")


def resting(stage):
    stage.score(12)
    terminal = stage.terminal("--arm").see("playing  bar 1:3")
    return terminal.type(b"r").see("resting  bar")


def standing_by(stage):
    stage.device.stop()
    stage.board("misreads")
    return stage.terminal("--arm").see("Press b to bring everything back")


STATES = {"playing": playing, "paused": paused, "resting": resting, "standing-by": standing_by}
NAMES = [name for name in OPERATOR if not name.endswith("-asked")]


@pytest.mark.parametrize("name", NAMES)
def test_vent_and_stop_do_in_each_state_what_the_table_says(stage, whole, name):
    row = OPERATOR[name]
    deed, state = name.split("-", 1)
    stage.score(8)
    stage.board()
    terminal = STATES[state](stage)
    terminal.type(KEYS[deed])
    code, shown = terminal.end()
    assert code == row.exit, shown
    assert row.told in shown and f"the player is {row.state}" in shown
    stage.shut()
    assert (" to vented: vent" in stage.statuses()[-1]) == (row.state == "vented"), stage.statuses()
    kept = whole()
    assert kept[-1].kind == "end" and kept[-1].told["ended"] == row.ended
    asked = [record.told["command"] for record in kept if record.kind == "command"]
    assert asked[-1] == deed


def test_a_vent_at_the_question_whether_to_arm_is_no_arming(stage):
    row = OPERATOR["vent-asked"]
    stage.board()
    code, shown = stage.terminal().see(ARM).type(b"v\n").end()
    assert code == row.exit and row.told in shown and row.then in shown
    assert not any(" to armed" in status for status in stage.statuses())


def test_a_stop_at_the_question_whether_to_arm_ends_the_program(stage):
    row = OPERATOR["stop-asked"]
    stage.board()
    code, shown = stage.terminal().see(ARM).type(b"\x03").end()
    assert code == row.exit and row.told in shown
    assert not any(" to armed" in status for status in stage.statuses())


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGHUP])
def test_being_told_to_end_is_a_stop(stage, whole, number):
    row = OPERATOR["stop-playing"]
    stage.score(8)
    stage.board()
    terminal = playing(stage)
    terminal.process.send_signal(number)
    code, shown = terminal.end()
    assert code == row.exit, shown
    stage.shut()
    assert whole()[-1].told["ended"] == row.ended
