"""A rig under the hands, in virtual time: what is sent, and what brings all to rest."""

from fractions import Fraction

import numpy as np
import pytest

from player.inputs.events import Ask, Back, Begin, HoldToRun, Silent, Timing, Wanted
from player.inputs.midi_clock import ClockFollower


def wanted(fibers, stroke, how="takes"):
    return Wanted("box", 0.0, fibers, stroke, how)


def test_a_fader_moves_its_fibers_as_fast_as_they_can_and_no_faster(make_bench):
    bench = make_bench().run(0.1)
    bench.hands.do(wanted((0, 1), 0.5))
    bench.run(0.1)
    # 0.6 1/s of filling against 0.15 of strain: not there yet, and at the rate's limit.
    assert bench.share[0] == pytest.approx(0.6 * 0.1 / 0.3, rel=0.1) and bench.share[2] == 0.0
    bench.run(0.5)
    assert bench.share == pytest.approx([0.5, 0.5, 0.0, 0.0], abs=1e-6)
    assert bench.snags() == ()


def test_nervous_hands_on_every_limit_leave_no_snag(make_bench):
    bench = make_bench(rig={"max_hold_s": 0.8, "duty": 0.4, "duty_burst_s": 1.0, "receiver_L": 0.5, "max_receiver_kPa": 470.0})
    rng = np.random.default_rng(5)
    for _ in range(150):
        how = ("takes", "adds", "scales")[rng.integers(3)]
        bench.hands.do(wanted((int(rng.integers(4)),), float(rng.choice([0.0, 1.0, rng.random()])), how))
        bench.run(float(rng.uniform(0.005, 0.1)))
    assert bench.snags() == ()
    assert any(view.cut.any() for view in bench.views)


def test_a_source_that_falls_silent_has_its_fibers_come_to_rest_and_it_is_said(make_bench):
    bench = make_bench().run(0.02)
    bench.hands.do(wanted((0,), 0.8), wanted((1,), 0.4))
    bench.run(1.0)
    bench.hands.do(Silent("box", 0.0, (0,), "box: the port is gone"))
    began = len(bench.strains)
    bench.run(3.0)
    assert bench.share == pytest.approx([0.0, 0.4, 0.0, 0.0], abs=1e-6)
    assert any(said.startswith("box: the port is gone; 1 fibers come to rest") for said in bench.told)
    falls = -np.diff(np.array(bench.strains)[began:, 0]).min() / 0.005, -np.diff(np.array(bench.strains)[began:, 0])
    # At the safe rate: two thirds of the fastest, 0.3 1/s.
    assert falls[1].max() / 0.005 == pytest.approx(0.2, rel=1e-3)
    bench.hands.do(Back("box", 0.0))
    bench.run(0.1)
    assert any("there again" in said for said in bench.told) and bench.share[0] == 0.0


def test_a_score_plays_under_the_hands(make_bench, score):
    bench = make_bench(score=score).run(0.02)
    bench.hands.do(wanted((1,), 0.6))
    bench.run(0.6)
    # r.1 nods by the score: up within half a second; r.2 is in the hand.
    assert max(strain[0] for strain in bench.strains) / 0.3 == pytest.approx(0.8, abs=0.02)
    assert bench.share[1] == pytest.approx(0.6, abs=1e-6)
    assert bench.live.position_s == pytest.approx(0.6, abs=0.05)


def test_a_cue_that_waits_holds_the_score_and_not_the_hands(make_bench, score):
    bench = make_bench(score=score).run(3.0)
    assert bench.states[-1] == "paused" and bench.live.position_s == pytest.approx(2.0)
    bench.hands.do(wanted((2,), 0.3))
    bench.run(1.0)
    assert bench.share[2] == pytest.approx(0.3, abs=1e-6) and bench.live.position_s == pytest.approx(2.0)
    bench.hands.do(Ask("box", 0.0, "go_on"))
    bench.run(0.5)
    assert bench.states[-1] == "playing" and bench.live.position_s > 2.2


def test_a_pause_holds_the_hands_too(make_bench):
    bench = make_bench().run(0.02)
    bench.hands.do(wanted((0,), 0.5))
    bench.run(1.0)
    bench.hands.do(Ask("box", 0.0, "pause"))
    bench.run(0.1)
    bench.hands.do(wanted((0,), 1.0))
    bench.run(1.0)
    assert bench.states[-1] == "paused" and bench.share[0] == pytest.approx(0.5, abs=1e-6)
    at = bench.live.position_s
    bench.hands.do(Ask("box", 0.0, "go_on"))
    bench.run(0.2)
    bench.hands.do(wanted((0,), 1.0))
    bench.run(1.0)
    assert bench.share[0] == pytest.approx(1.0, abs=1e-6) and bench.live.position_s > at + 1.0


def test_a_long_pause_lets_down_what_may_not_be_held(make_bench):
    bench = make_bench(rig={"max_hold_s": 1.5}).run(0.02)
    bench.hands.do(wanted((0,), 0.9))
    bench.run(1.0)
    bench.hands.do(Ask("box", 0.0, "pause"))
    bench.run(3.0)
    assert bench.share[0] <= 0.5 and bench.live.let_down == 1 and bench.snags() == ()


def test_rest_from_a_key_of_the_box_brings_all_to_rest_and_disarms(make_bench):
    bench = make_bench().run(0.02)
    bench.hands.do(wanted((0, 1, 2, 3), 0.9))
    bench.run(1.0)
    bench.hands.do(Ask("box", 0.0, "rest"))
    bench.run(10.0)
    assert not bench.share.any() and bench.engine.safety.state == "idle" and bench.engine.ending.how == "stopped"
    assert bench.snags() == ()


def test_vent_from_a_key_of_the_box_vents_at_once(make_bench):
    bench = make_bench().run(0.02)
    bench.hands.do(wanted((0, 1, 2, 3), 0.9))
    bench.run(0.5)
    began = len(bench.states)
    bench.hands.do(Ask("box", 0.0, "vent"))
    bench.run(1.0)
    assert bench.engine.safety.state == "vented" and len(bench.states) - began <= 2


def test_no_hand_can_arm(make_bench):
    bench = make_bench(armed=False)
    bench.hands.do(wanted((0,), 1.0), Ask("osc", 0.0, "go_on"))
    bench.run(1.0)
    assert bench.engine.safety.state == "idle" and bench.strains == []


def test_a_rig_that_is_to_be_held_does_nothing_until_it_is(make_bench, score):
    bench = make_bench(score=score, hold=True)
    bench.hands.do(wanted((1,), 1.0))
    bench.run(1.0)
    assert not bench.share.any() and bench.live.position_s == 0.0 and bench.live.phase == "to be held"
    bench.hands.do(HoldToRun("pedal", 0.0, True))
    bench.run(0.4)
    assert bench.share[0] > 0.3 and bench.live.position_s > 0.3


def test_letting_go_of_the_pedal_brings_all_to_rest(make_bench):
    bench = make_bench(hold=True)
    bench.hands.do(HoldToRun("pedal", 0.0, True))
    bench.run(0.05)
    bench.hands.do(wanted((0, 1), 0.9))
    bench.run(1.0)
    bench.hands.do(HoldToRun("pedal", 0.0, False))
    bench.run(10.0)
    assert not bench.share.any() and bench.engine.safety.state == "idle"
    assert "let go: all comes to rest" in bench.told


def test_of_two_pedals_either_holds(make_bench):
    bench = make_bench(hold=True)
    bench.hands.do(HoldToRun("one", 0.0, True), HoldToRun("two", 0.0, True))
    bench.run(0.05)
    bench.hands.do(HoldToRun("one", 0.0, False))
    bench.run(0.5)
    assert bench.states[-1] == "playing"


def test_a_phrase_is_played_at_the_running_tempo_scaled_by_velocity(make_bench, score):
    bench = make_bench(score=score).run(0.02)
    bench.hands.do(Begin("box", 0.0, "lift", (3,), 0.5, ("k",)))
    bench.run(0.7)
    # A count at 120 a minute is half a second: up by then to half of 0.5.
    assert bench.share[3] == pytest.approx(0.25, abs=1e-3)


def test_a_quantised_start_lands_on_the_count_of_the_score(make_bench, score):
    bench = make_bench(score=score).run(0.13)
    at = bench.hands.beat.next_s(bench.clock.now(), Fraction(1))
    bench.hands.do(Begin("box", at, "lift", (3,), 1.0, ("k",)))
    bench.run(0.6)
    moving = next(n for n, strain in enumerate(bench.strains) if strain[3] > 0.0)
    # Count 2 is at 0.5 s of the score.
    assert bench.positions[moving] == pytest.approx(0.5, abs=0.011)


def test_tapped_tempo_is_the_running_tempo(make_bench):
    bench = make_bench().run(0.1)
    for tap in range(4):
        bench.hands.do(Ask("box", 1.0 + 0.4 * tap, "tap_tempo"))
    bench.run(0.1)
    assert bench.views[-1].counts_a_minute == pytest.approx(150.0)


def test_pickup_is_told_where_the_fibers_are_wanted(make_bench):
    bench = make_bench().run(0.02)
    bench.hands.do(wanted((0,), 0.5))
    bench.run(0.1)
    assert bench.hands.present.tolist() == [0.5, 0.0, 0.0, 0.0]


def test_an_alarmed_fiber_stays_at_rest_whatever_a_hand_wants(make_bench):
    bench = make_bench().run(0.02)
    bench.live.set_down(0)
    bench.hands.do(wanted((0, 1), 0.5))
    bench.run(1.0)
    assert bench.share.tolist() == pytest.approx([0.0, 0.5, 0.0, 0.0], abs=1e-6)


def test_what_hands_wanted_before_a_vent_is_forgotten(make_bench):
    bench = make_bench()
    bench.engine.returns, bench.engine.returns_from = True, ("fault", "stopped", "vented")
    bench.run(0.02)
    bench.hands.do(wanted((0,), 0.9))
    bench.run(1.0)
    bench.engine.ask("vent")
    bench.run(8.0)
    bench.engine.ask("bring_back")
    bench.run(8.0)
    assert bench.engine.safety.state == "playing" and bench.share[0] == 0.0


def test_a_score_that_follows_a_clock_is_where_the_clock_is(make_bench, score):
    bench = make_bench(score=score, follower=ClockFollower(2.0), rig={"fill": 3.0, "exhaust": 3.0}).run(0.05)
    start = bench.clock.now()
    bench.hands.do(Timing("box", start, "start"))
    # 100 counts a minute where the score says 120.
    period = 0.6 / 24
    for tick in range(60):
        bench.run(max(0.0, start + 0.02 + tick * period - bench.clock.now()))
        bench.hands.do(Timing("box", start + 0.02 + tick * period, "clock"))
    bench.run(0.005)
    counts = bench.live.position_s * 2.0
    in_force = bench.clock.now() + bench.live.latency_s + 0.005
    assert counts == pytest.approx((in_force - start - 0.02) / 0.6, abs=0.03)
    bench.hands.do(Timing("box", bench.clock.now(), "stop"))
    bench.run(0.5)
    at = bench.live.position_s
    bench.run(0.5)
    assert bench.live.position_s == at and bench.snags() == ()
    assert "the clock has been stopped" in bench.told
