"""The safety states, read from their own table."""

import pytest

from player.engine.safety import DEEDS, EVENTS, FAULTS, STATES, TABLE, Refused, Safety, after


def test_every_row_names_known_states_events_and_deeds():
    for row in TABLE:
        assert row.state in STATES and row.next in STATES and row.event in EVENTS
        assert set(row.must) <= set(DEEDS)


def test_no_state_has_two_rows_for_one_event():
    pairs = [(row.state, row.event) for row in TABLE]
    assert len(pairs) == len(set(pairs))


@pytest.mark.parametrize("state", STATES)
def test_a_vent_is_honoured_in_every_state_and_vents_the_boards(state):
    then, must = after(Safety(state, checked=True), "vent")
    assert then == Safety("vented", checked=False)
    assert must == ("vent",)


@pytest.mark.parametrize("state", [state for state in STATES if state != "idle"])
def test_arming_is_possible_from_idle_alone(state):
    with pytest.raises(Refused, match=f"while the player is {state}"):
        after(Safety(state, checked=True), "arm")


def test_arming_wants_a_preflight_that_nothing_has_used_up():
    with pytest.raises(Refused, match="needs a pre-flight first"):
        after(Safety("idle"), "arm")
    checked, _ = after(Safety("idle"), "preflight")
    armed, must = after(checked, "arm")
    assert (armed, must) == (Safety("armed"), ("arm",))


def test_from_vented_the_only_ways_are_a_preflight_a_fault_that_changes_nothing_and_a_vent():
    ways = {row.event: row.next for row in TABLE if row.state == "vented"}
    assert ways == {"preflight": "idle", "fault": "vented", "vent": "vented"}


def test_a_preflight_after_a_vent_does_not_arm_by_itself():
    then, must = after(Safety("vented"), "preflight")
    assert then.state == "idle" and must == ()


def test_after_a_run_a_new_preflight_is_wanted_before_arming():
    safety = Safety()
    for event in ("preflight", "arm", "play", "end", "at_rest"):
        safety, _ = after(safety, event)
    assert safety == Safety("idle", checked=False)


@pytest.mark.parametrize("state", ["armed", "playing", "paused"])
@pytest.mark.parametrize("event", ["rest", "fault"])
def test_a_stop_or_a_fault_lets_every_fiber_down(state, event):
    then, must = after(Safety(state), event)
    assert then.state == "resting" and must == ("let_down",)


def test_a_way_to_rest_ends_disarmed():
    then, must = after(Safety("resting"), "at_rest")
    assert then.state == "idle" and must == ("disarm",)


def test_what_is_not_in_the_table_is_refused_with_what_would_be_taken():
    with pytest.raises(Refused, match="it would take at_rest, fault, vent"):
        after(Safety("resting"), "play")


def test_every_state_can_be_reached_and_left():
    assert {row.next for row in TABLE} == set(STATES)
    for state in STATES:
        assert any(row.state == state and row.next != state for row in TABLE)


def test_every_fault_code_of_the_wire_means_an_event_of_the_table_or_a_note():
    from player.wire.messages import FAULTS as CODES

    assert set(CODES) == set(FAULTS)
    assert {means for _, means, *_ in FAULTS.values()} <= {*EVENTS, "note"}
