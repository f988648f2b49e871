"""The engine in virtual time: ticks, due times, stops, faults."""

import gc

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.motion import strain_at
from player.engine.loop import AHEAD_S
from player.engine.safety import Refused
from player.engine.transport import Cue
from player.outputs.base import Event
from player.outputs.sim import Sim

RISE = [(0.5, 2.0, 0.3), (3.0, 5.0, 0.0)]


def play(engine, at=None, start_s=0.0):
    """Run an engine to its end, asking it for things at given ticks; the last snapshot and all that was told."""
    told, status = [], None
    for status in engine.run(start_s):
        told += status.told
        for ask in (at or {}).get(status.ticks, ()):
            engine.ask(*ask) if isinstance(ask, tuple) else engine.ask(ask)
    final = engine.status()
    return final, told + list(final.told)


@pytest.fixture
def tracks(make_tracks):
    return make_tracks(4, RISE, duration_s=6.0)


def test_a_score_is_sent_tick_by_tick_and_ends_at_rest_and_disarmed(make_engine, make_rig, tracks, kept):
    output = kept(must_arm=True)
    engine = make_engine(make_rig(4), tracks, [output])
    play(engine)
    assert engine.ending.how == "end" and engine.ending.exit_code == 0 and engine.ending.state == "idle"
    assert output.deeds == ["arm", "rest"]
    assert np.abs(output.commands[-1]).max() < 1e-5


def test_due_times_come_from_the_number_of_the_tick(make_engine, make_rig, tracks, kept):
    output = kept()
    play(make_engine(make_rig(4), tracks, [output], rate_Hz=250.0))
    assert np.abs(np.diff(output.due) - 0.004).max() < 1e-9


def test_a_late_host_is_counted_and_never_reaches_a_due_time(make_engine, make_rig, tracks, kept):
    steady, jittery = kept(), kept()
    play(make_engine(make_rig(4), tracks, [steady]))
    spread = np.random.default_rng(3).uniform(0.0, 0.02, 100_000)
    late = iter(spread)
    engine = make_engine(make_rig(4), tracks, [jittery], late=lambda moment: next(late))
    status, _ = play(engine)
    assert np.allclose(jittery.due - jittery.due[0], steady.due - steady.due[0], atol=1e-9)
    assert np.array_equal(jittery.commands, steady.commands)
    assert status.late_ticks > 200 and status.past_due == 0
    assert engine.lateness.worst_s == pytest.approx(spread[: status.ticks].max(), abs=2e-3)


def test_sets_are_sent_ahead_of_their_due_time_by_the_stated_bound(make_engine, make_rig, tracks, kept):
    output = kept()
    engine = make_engine(make_rig(4), tracks, [output])
    assert engine.ahead_s == AHEAD_S
    for status in engine.run():
        if status.state == "idle":
            break
        assert output.due[-1] - engine.clock.now() == pytest.approx(AHEAD_S)


def test_a_short_queue_shortens_how_far_ahead_sets_are_sent(make_engine, make_rig, tracks, kept):
    engine = make_engine(make_rig(4), tracks, [kept(queue_sets=64), kept(queue_sets=8)])
    assert engine.ahead_s == pytest.approx(0.75 * 8 * 0.005)


def test_sets_are_never_sent_less_than_two_ticks_ahead(make_engine, make_rig, tracks, kept):
    assert make_engine(make_rig(4), tracks, [kept()], rate_Hz=20.0).ahead_s == pytest.approx(0.1)


def test_a_host_that_stalls_for_longer_makes_the_score_later_and_leaves_nothing_out(make_engine, make_rig, tracks, kept):
    steady, stalled = kept(), kept()
    play(make_engine(make_rig(4), tracks, [steady]))
    stalls = {300: 0.7}
    waits = iter(range(10**6))
    engine = make_engine(make_rig(4), tracks, [stalled], late=lambda moment: stalls.get(next(waits), 0.0))
    _, told = play(engine)
    assert np.array_equal(stalled.commands, steady.commands)
    assert engine.lateness.slips == 1 and engine.lateness.slipped_s == pytest.approx(0.7, abs=0.01)
    assert np.diff(stalled.due).max() == pytest.approx(0.7, abs=0.01)
    assert any("stood still for 0.7" in say for say in told)


def test_two_boards_are_given_the_same_sets_for_the_same_instants(make_engine, make_rig, tracks, kept):
    one, other = kept(("board1",)), kept(("board2",))
    play(make_engine(make_rig(4, boards=2), tracks, [one, other]))
    assert np.array_equal(one.due, other.due) and np.array_equal(one.commands, other.commands)


def test_each_tick_wants_the_strain_of_its_own_end(make_engine, make_rig, tracks, kept):
    output = kept()
    rig = make_rig(4)
    play(make_engine(rig, tracks, [output]))
    ends = (np.arange(len(output.due)) + 1) * 0.005
    wanted = strain_at(tracks, abilities_of(rig), ends).T / 0.3
    assert np.abs(output.commands - wanted)[:1200].max() < 1e-9


@pytest.mark.parametrize("drive", ["strain", "valve"])
def test_the_simulated_rig_is_where_the_score_wants_it_to_a_tick_of_travel(make_engine, make_rig, tracks, drive):
    rig = make_rig(4, drive=drive)
    sim = Sim(rig, abilities_of(rig), ("main",))
    engine = make_engine(rig, tracks, [sim])
    play(engine)
    # Half of what a fiber goes in a tick at its fastest: within a tick it is at its set-point early, then waits there.
    assert 0.0 < engine.sensing.errors.worst.error <= 0.5 * 0.6 * 0.005
    assert sim.counters()["strain_left"] == 0.0


@pytest.mark.parametrize("at", [1, 60, 150, 300, 399, 500, 700, 999, 1100, 1199])
@pytest.mark.parametrize("drive", ["strain", "valve"])
def test_a_stop_at_any_tick_ends_at_rest_and_disarmed(make_engine, make_rig, tracks, kept, at, drive):
    rig = make_rig(4, drive=drive)
    sim, output = Sim(rig, abilities_of(rig), ("main",)), kept(must_arm=True)
    engine = make_engine(rig, tracks, [sim, output])
    play(engine, {at: ["stop"]})
    assert (engine.ending.how, engine.ending.state, engine.ending.exit_code) == ("stopped", "idle", 0)
    assert output.deeds == ["arm", "rest"]
    assert sim.counters()["strain_left"] < 1e-4
    assert np.abs(output.commands[-1]).max() < 1e-5


def test_a_second_stop_on_the_way_to_rest_vents(make_engine, make_rig, tracks, kept):
    output = kept(must_arm=True)
    engine = make_engine(make_rig(4), tracks, [output])
    play(engine, {500: ["stop"], 540: ["stop"]})
    assert output.deeds == ["arm", "vent"] and len(output.sets) < 545
    assert (engine.ending.how, engine.ending.state, engine.ending.exit_code) == ("vented", "vented", 1)


def test_two_stops_at_once_vent(make_engine, make_rig, tracks, kept):
    output = kept()
    engine = make_engine(make_rig(4), tracks, [output])
    play(engine, {500: ["stop", "stop"]})
    assert engine.ending.state == "vented" and output.deeds == ["arm", "vent"]


@pytest.mark.parametrize("before", [[], ["pause"], ["stop"]])
def test_a_vent_is_done_before_another_set_is_sent(make_engine, make_rig, tracks, kept, before):
    output = kept()
    engine = make_engine(make_rig(4), tracks, [output])
    play(engine, {400: before, 450: ["pause", "vent"]})
    assert len(output.sets) == 450 and output.deeds[-1] == "vent" and engine.ending.state == "vented"


def test_after_a_vent_arming_wants_a_fresh_preflight(make_engine, make_rig, tracks, kept):
    engine = make_engine(make_rig(4), tracks, [kept()])
    play(engine, {100: ["vent"]})
    with pytest.raises(Refused):
        engine.arm()
    engine.preflight()
    engine.arm()
    assert engine.safety.state == "armed"


def test_without_a_passed_preflight_nothing_is_armed(make_engine, make_rig, tracks, kept):
    output = kept()
    output.ready = False
    engine = make_engine(make_rig(4), tracks, [output], armed=False)
    engine.preflight()
    with pytest.raises(Refused):
        engine.arm()
    assert output.deeds == []


def test_a_pause_holds_and_going_on_plays_the_rest(make_engine, make_rig, tracks, kept):
    whole, paused = kept(), kept()
    play(make_engine(make_rig(4), tracks, [whole]))
    engine = make_engine(make_rig(4), tracks, [paused])
    play(engine, {450: ["pause"], 850: ["go_on"]})
    assert len(paused.sets) == len(whole.sets) + 400
    assert np.all(paused.commands[451:850] == 1.0)
    assert np.allclose(paused.commands[851:], whole.commands[451:], atol=1e-9)


def test_a_waiting_cue_pauses_and_tells_and_goes_on_when_asked(make_engine, make_rig, tracks, kept):
    output = kept()
    engine = make_engine(make_rig(4), tracks, [output], cues=(Cue("doors", 2.5, wait=True),))
    waiting = []
    for status in engine.run():
        if status.waiting:
            waiting.append(status)
            if len(waiting) == 100:
                engine.ask("go_on")
    assert len(waiting) == 100 and waiting[0].state == "paused" and waiting[0].position_s == 2.5
    assert engine.ending.how == "end" and len(output.sets) == 1200 + 100


def test_going_on_where_nothing_is_paused_is_refused_in_words(make_engine, make_rig, tracks, kept):
    engine = make_engine(make_rig(4), tracks, [kept()])
    _, told = play(engine, {100: ["go_on", "next_cue"]})
    assert any("'go_on' means nothing while the player is playing" in say for say in told)
    assert "there is no further cue" in told
    assert engine.ending.how == "end"


def test_from_a_place_the_fibers_are_brought_there_before_the_score_begins(make_engine, make_rig, tracks, kept):
    output = kept()
    engine = make_engine(make_rig(4), tracks, [output])
    play(engine, start_s=2.5)
    steps = np.diff(output.commands[:, 0]) * 0.3 / 0.005
    assert steps.max() <= 0.4 + 1e-6
    assert len(output.sets) == pytest.approx((1.40625 + 3.5) / 0.005, abs=3)


def test_a_board_that_is_lost_ends_the_run_in_a_fault_and_the_others_come_to_rest(make_engine, make_rig, tracks, kept):
    lost, other = kept(("board1",), must_arm=True), kept(("board2",), must_arm=True)
    lost.lost_at = 500
    engine = make_engine(make_rig(4, boards=2), tracks, [lost, other])
    status, told = play(engine)
    assert (engine.ending.how, engine.ending.exit_code, engine.ending.state) == ("fault", 1, "idle")
    assert engine.ending.faults[0].driver == "board1" and "unplugged" in engine.ending.faults[0].say
    assert any("unplugged" in say for say in told)
    assert other.deeds == ["arm", "rest"] and np.all(other.commands[-1] == 0.0) and len(other.sets) > 500
    assert dict(status.links)["board1"] == "lost"


def test_where_the_only_board_is_lost_the_run_ends_at_once(make_engine, make_rig, tracks, kept):
    lost = kept(must_arm=True)
    lost.lost_at = 500
    engine = make_engine(make_rig(4), tracks, [lost])
    status, _ = play(engine)
    assert engine.ending.how == "fault" and status.ticks <= 503


@pytest.mark.parametrize(
    ("code", "how", "state"),
    [(1, "fault", "idle"), (2, "fault", "idle"), (4, "fault", "idle"), (6, "fault", "vented"), (99, "fault", "idle")],
)
def test_a_fault_that_a_board_reports_ends_the_run(make_engine, make_rig, tracks, kept, code, how, state):
    output = kept()
    engine = make_engine(make_rig(4), tracks, [output])
    for status in engine.run():
        if status.ticks == 500:
            output.events.append(Event("fault", "main", "says the board", code=code))
    assert (engine.ending.how, engine.ending.state, engine.ending.exit_code) == (how, state, 1)
    assert "says the board" in engine.ending.faults[0].say


@pytest.mark.parametrize("code", [5, 7])
def test_a_fault_that_only_warns_is_kept_and_the_score_goes_on(make_engine, make_rig, tracks, kept, code):
    output = kept()
    engine = make_engine(make_rig(4), tracks, [output])
    for status in engine.run():
        if status.ticks in (500, 501):
            output.events.append(Event("fault", "main", code=code))
    assert engine.ending.how == "end" and len(engine.ending.faults) == 1 and engine.ending.more_faults == 1
    assert engine.ending.exit_code == 1


def test_a_board_that_disarms_by_itself_in_mid_run_ends_it(make_engine, make_rig, tracks, kept):
    output = kept()
    engine = make_engine(make_rig(4), tracks, [output])
    for status in engine.run():
        if status.ticks == 500:
            output.events.append(Event("state", "main", status="vented"))
    assert engine.ending.how == "fault" and "vented in mid-run" in engine.ending.why


def test_a_board_that_does_not_say_that_it_has_disarmed_is_vented(make_engine, make_rig, tracks, kept):
    output = kept(must_arm=True)
    engine = make_engine(make_rig(4), tracks, [output])
    output.rest = lambda over_s: output.deeds.append("rest")
    play(engine)
    assert output.deeds == ["arm", "rest", "vent"]
    assert (engine.ending.how, engine.ending.state) == ("fault", "vented")


def test_a_caller_that_breaks_off_leaves_the_boards_vented(make_engine, make_rig, tracks, kept):
    output = kept(must_arm=True)
    engine = make_engine(make_rig(4), tracks, [output])
    with pytest.raises(ZeroDivisionError):
        for status in engine.run():
            1 / (status.ticks - 300)
    engine.close()
    assert output.deeds == ["arm", "vent", "close"]


def test_closing_an_armed_engine_vents_first(make_engine, make_rig, tracks, kept):
    output = kept(must_arm=True)
    make_engine(make_rig(4), tracks, [output]).close()
    assert output.deeds == ["arm", "vent", "close"]


def test_a_stop_between_arming_and_playing_disarms_without_a_set(make_engine, make_rig, tracks, kept):
    output = kept(must_arm=True)
    engine = make_engine(make_rig(4), tracks, [output])
    engine.ask("stop")
    play(engine)
    assert output.deeds == ["arm", "rest"] and output.sets == []
    assert (engine.ending.how, engine.ending.state) == ("stopped", "idle")


def test_garbage_is_not_collected_while_it_plays_and_is_afterwards(make_engine, make_rig, tracks, kept):
    engine = make_engine(make_rig(4), tracks, [kept()])
    assert gc.isenabled()
    during = {gc.isenabled() for _ in engine.run()}
    assert during == {False} and gc.isenabled()


def test_ways_of_different_valves_are_each_sent_ahead_by_their_own_response(make_engine, make_rig, tracks, kept):
    from dataclasses import replace

    rig = make_rig(4)
    first = rig.fibers[0]
    slow = replace(first.mounting, valve=replace(first.mounting.valve, switch_ms=38.0))
    rig = replace(rig, fibers=(replace(first, mounting=slow), *rig.fibers[1:]))
    sim = Sim(rig, abilities_of(rig), ("main",))
    engine = make_engine(rig, tracks, [sim])
    play(engine)
    assert engine.sensing.errors.worst.error <= 0.5 * 0.6 * 0.005


def lost_in_mid_run(make_engine, make_rig, make_tracks, kept):
    """An engine with an operator, the board of which is lost at the 50th set, up to where it stands by."""
    output = kept(must_arm=True)
    engine = make_engine(make_rig(4), make_tracks(4, [(0.0, 1.0, 0.3), (1.5, 2.5, 0.0)]), [output])
    engine.returns, output.lost_at = True, 50
    # What was sensed before the loss says nothing of where fibers are when they are brought back.
    output.events.append(Event("sense", "main", time_s=0.0, fibers=np.arange(4), strain=np.full(4, 0.25)))
    run = engine.run()
    told = [word for status in run_until(run, "idle") for word in status.told]
    return engine, output, run, told


def run_until(run, state):
    for status in run:
        yield status
        if status.state == state and any("Press b" in word for word in status.told):
            return


def test_a_lost_board_is_brought_back_by_the_operator_alone_and_the_score_goes_on_from_there(
    make_engine, make_rig, make_tracks, kept
):
    engine, output, run, told = lost_in_mid_run(make_engine, make_rig, make_tracks, kept)
    assert any("Press b" in word for word in told)
    stood = engine.source.position_s
    for _ in range(100):
        next(run)
    assert engine.safety.state == "idle" and "reattach" not in output.deeds and len(output.sets) == 50
    engine.ask("bring_back")
    for _ in run:
        pass
    assert output.deeds.count("arm") == 2 and engine.ending.how == "end" and engine.ending.exit_code == 1
    back = output.commands[50:]
    # Brought from rest to where the score stood, no faster than fibers go, then to the end.
    assert back[0].max() < 0.05 and np.abs(np.diff(back, axis=0)).max() <= 2.0 * 0.6 / 0.3 / engine.rate_Hz
    assert 0.0 < stood < engine.source.position_s == 2.5


def test_a_board_that_is_still_missing_or_not_ready_leaves_the_run_standing_by(make_engine, make_rig, make_tracks, kept):
    engine, output, run, _ = lost_in_mid_run(make_engine, make_rig, make_tracks, kept)
    output.missing = True
    engine.ask("bring_back")
    assert any("still unplugged" in word for _ in range(3) for word in next(run).told)
    output.missing, output.ready = False, False
    engine.ask("bring_back")
    assert any("not so: it is ready" in word for _ in range(3) for word in next(run).told)
    assert engine.safety.state == "idle" and output.deeds.count("arm") == 1
    engine.ask("stop")
    for _ in run:
        pass
    assert engine.ending.how == "fault" and engine.ending.exit_code == 1


def test_without_an_operator_a_lost_board_ends_the_run(make_engine, make_rig, make_tracks, kept):
    output = kept(must_arm=True)
    engine = make_engine(make_rig(4), make_tracks(4, [(0.0, 1.0, 0.3)]), [output])
    output.lost_at = 50
    for _ in engine.run():
        pass
    assert engine.ending.how == "fault" and "arm" in output.deeds and output.deeds.count("arm") == 1
