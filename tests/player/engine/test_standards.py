"""The safety states against what standards ask of an emergency stop and of a supply that fails; clauses are in outside.toml.

The player is no emergency stop: what it can do in software is held to the same demands all the same.
"""

import re
from itertools import product
from pathlib import Path

import pytest

import player
from player.engine.safety import EVENTS, STATES, TABLE, Refused, Safety, after
from player.outputs.base import Event

PAGE = Path(player.__file__).parent / "manual" / "faults.md"


def goes(safety, *events):
    """The state after events, those that are refused changing nothing; and all that was done."""
    done = []
    for event in events:
        try:
            safety, must = after(safety, event)
        except Refused:
            continue
        done += must
    return safety, done


@pytest.mark.parametrize("state", STATES)
@pytest.mark.parametrize("checked", [False, True])
def test_a_vent_overrides_every_function_in_every_state(outside, state, checked):
    assert outside["emergency_stop"]["overrides_all"]
    assert after(Safety(state, checked), "vent") == (Safety("vented"), ("vent",))


def test_a_vent_goes_before_all_else_that_was_asked_at_the_same_time(make_rig, make_tracks, make_engine, kept):
    rig, output = make_rig(), kept()
    engine = make_engine(rig, make_tracks(4, [(0.0, 1.0, 0.2)], duration_s=5.0), [output])
    for n, _ in enumerate(engine.run()):
        if n == 50:
            for kind in ("pause", "go_on", "jump", "vent"):
                engine.ask(kind, 1.0)
    assert engine.safety.state == "vented" and output.deeds[-1] == "vent"
    # Nothing was sent after it.
    assert len(output.sets) <= 52


@pytest.mark.parametrize("events", list(product([event for event in EVENTS if event != "preflight"], repeat=3))[::7])
def test_a_vent_stays_in_force_until_a_fresh_pre_flight_whatever_else_is_asked(outside, events):
    assert outside["emergency_stop"]["stays_until_reset"]
    safety, done = goes(Safety("vented"), *events)
    assert safety.state == "vented" and set(done) <= {"vent"}


def test_the_reset_of_a_vent_starts_nothing_by_itself(outside):
    assert outside["emergency_stop"]["reset_starts_nothing"]
    safety, done = goes(Safety("vented"), "preflight")
    assert safety.state == "idle" and done == []
    # Arming and playing are two deeds more, in this order and no other.
    assert goes(safety, "play")[0].state == "idle" and goes(safety, "go_on")[0].state == "idle"
    assert goes(safety, "arm") == (Safety("armed"), ["arm"])
    assert goes(safety, "arm", "play")[1] == ["arm", "start"]


def test_the_only_way_out_of_a_vent_is_the_operators_own_deed():
    ways = {row.event for row in TABLE if row.state == "vented" and row.next != "vented"}
    assert ways == {"preflight"}


def test_an_engine_that_was_vented_sends_nothing_until_it_is_armed_anew(make_rig, make_tracks, make_engine, kept):
    rig, output = make_rig(), kept()
    engine = make_engine(rig, make_tracks(4, [(0.0, 1.0, 0.2)], duration_s=5.0), [output])
    for n, _ in enumerate(engine.run()):
        if n == 20:
            engine.ask("vent")
    sent = len(output.sets)
    assert list(engine.run()) == [] and len(output.sets) == sent
    with pytest.raises(Refused):
        engine.arm()
    engine.preflight()
    assert engine.safety.state == "idle" and len(output.sets) == sent


@pytest.mark.parametrize("kPa", [449.0, 0.0])
def test_a_supply_that_fails_brings_all_to_rest_and_its_return_starts_nothing(
    outside, make_rig, make_tracks, make_engine, kept, kPa
):
    assert outside["loss_of_pressure"]["loss_is_safe"] and outside["loss_of_pressure"]["return_starts_nothing"]
    rig, output = make_rig(min_pressure_kPa=450.0), kept()
    engine = make_engine(rig, make_tracks(4, [(0.0, 1.0, 0.2)], duration_s=8.0), [output])
    for n, _ in enumerate(engine.run()):
        if n == 300:
            output.events.append(Event("supply", "main", kPa=kPa))
        if n == 320:
            output.events.append(Event("supply", "main", kPa=700.0))
    assert engine.ending.how == "fault" and engine.safety.state == "idle" and output.deeds[-1] == "rest"
    assert output.commands[-1].max() == 0.0
    assert list(engine.run()) == []


def test_a_supply_below_its_minimum_is_not_armed(make_rig, make_tracks, make_engine, kept):
    output = kept()
    output.ready = False
    engine = make_engine(make_rig(), make_tracks(4, [(0.0, 1.0, 0.2)]), [output], armed=False)
    assert not all(mark.ok for mark in engine.preflight())
    with pytest.raises(Refused):
        engine.arm()


def test_the_page_quotes_the_clauses_as_they_are_noted_and_says_that_they_are_from_memory(outside):
    said = PAGE.read_text(encoding="utf-8")
    said = said[said.index("## What standards ask") :]
    assert "From memory" in said
    for table, standard in (("emergency_stop", "ISO 13850:2015"), ("loss_of_pressure", "ISO 4414:2010")):
        clauses = {one["clause"] for one in outside[table].values() if isinstance(one, dict)}
        quoted = set(re.findall(rf"- {standard}, ([0-9.]+):", said))
        assert quoted == clauses and "from memory" in outside[table]["source"]
