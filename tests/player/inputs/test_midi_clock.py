import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.inputs.events import Timing
from player.inputs.midi_clock import COAST_S, TICKS, TICKS_A_SIXTEENTH, ClockFollower


def say(follower, what, at_s, value=0):
    follower.hear(Timing("seq", at_s, what, value))


def ticks(follower, count, period_s, from_s, jitter=None):
    """So many ticks; the moment of the one that would follow."""
    for number in range(count):
        say(follower, "clock", from_s + number * period_s + (jitter() if jitter else 0.0))
    return from_s + count * period_s


def kinds(follower):
    return [turn.kind for turn in follower.turns()]


def test_a_count_has_the_ticks_of_a_quarter_and_a_sixteenth_six(outside):
    assert outside["midi_1_0"]["clocks_a_quarter"] == TICKS
    assert outside["midi_1_0"]["clocks_a_sixteenth"] == TICKS_A_SIXTEENTH


@pytest.mark.parametrize("minute", [40, 72, 120, 180, 300])
@pytest.mark.parametrize("shape", ["uniform", "normal"])
def test_with_a_millisecond_of_jitter_the_tempo_is_right_to_a_500th_after_4_counts_and_landings_to_3_ms(minute, shape):
    period_s = 60.0 / minute / TICKS
    for seed in range(30):
        rng = np.random.default_rng(seed)
        jitter = (lambda: rng.uniform(-1e-3, 1e-3)) if shape == "uniform" else (lambda: rng.normal(0.0, 1e-3))  # noqa: B023
        follower = ClockFollower()
        say(follower, "start", 9.99)
        end_s = ticks(follower, 4 * TICKS + 1, period_s, 10.0, jitter) - period_s
        beat = follower.beat(end_s)
        assert beat.rate * 60.0 == pytest.approx(minute, rel=0.002)
        assert beat.when(4.0) == pytest.approx(end_s, abs=0.003)
        assert beat.when(5.0) == pytest.approx(end_s + 60.0 / minute, abs=0.003)


@pytest.mark.parametrize(("before", "after"), [(120, 123), (120, 132), (120, 90), (72, 144), (120, 60)])
def test_a_new_tempo_is_followed_within_three_counts(before, after):
    rng = np.random.default_rng(0)
    follower = ClockFollower()
    say(follower, "start", 0.0)
    at_s = ticks(follower, 8 * TICKS, 60.0 / before / TICKS, 0.0, lambda: rng.uniform(-1e-3, 1e-3))
    for number in range(3 * TICKS):
        say(follower, "clock", at_s + number * 60.0 / after / TICKS + rng.uniform(-1e-3, 1e-3))
        follower.beat(at_s)
    assert follower.beat(at_s).rate * 60.0 == pytest.approx(after, rel=0.005)
    assert follower.beat(at_s).when(11.0) == pytest.approx(at_s + 180.0 / after, abs=0.003)


def test_start_begins_at_count_0_with_the_next_tick():
    follower = ClockFollower()
    assert follower.beat(0.0) is None
    ticks(follower, 48, 0.02, 0.0)
    say(follower, "start", 0.951)
    assert follower.beat(0.955).rate == 0.0
    say(follower, "clock", 0.96)
    assert follower.beat(0.96).at(0.96) == pytest.approx(0.0, abs=1e-6)
    ticks(follower, 24, 0.02, 0.98)
    assert follower.beat(1.44).at(1.44) == pytest.approx(1.0, abs=1e-6)
    assert kinds(follower) == ["run"]


def test_a_stop_stands_and_continue_goes_on_from_there():
    follower = ClockFollower()
    say(follower, "start", 0.0)
    ticks(follower, 25, 0.02, 0.01)
    say(follower, "stop", 0.50)
    place = follower.beat(0.6).at(0.6)
    assert place == pytest.approx(25 / 24)
    assert follower.beat(9.0).at(9.0) == place
    ticks(follower, 10, 0.02, 0.51)
    say(follower, "continue", 0.705)
    say(follower, "clock", 0.71)
    assert follower.beat(0.71).at(0.71) == pytest.approx(place, abs=1e-6)
    assert kinds(follower) == ["run", "stop", "run"]


def test_song_position_is_in_sixteenths():
    follower = ClockFollower()
    say(follower, "songpos", 0.0, 16)
    assert follower.beat(0.0).at(0.0) == 4.0
    say(follower, "continue", 0.1)
    say(follower, "clock", 0.2)
    assert follower.beat(0.2).at(0.2) == pytest.approx(4.0)
    say(follower, "songpos", 0.3, 2)
    say(follower, "clock", 0.31)
    assert follower.beat(0.31).at(0.31) == pytest.approx(0.5)
    assert [(turn.kind, turn.place) for turn in follower.turns()] == [("locate", 4.0), ("run", 4.0), ("locate", 0.5)]


def running(minute=120):
    follower = ClockFollower()
    say(follower, "start", 0.0)
    end_s = ticks(follower, 96, 60.0 / minute / TICKS, 0.0)
    follower.turns()
    return follower, end_s, 60.0 / minute / TICKS


def test_a_clock_that_falls_silent_is_coasted_on_and_then_held_and_both_are_told():
    follower, end_s, period_s = running()
    last_s = end_s - period_s
    follower.tick(last_s + 0.05)
    assert follower.state == "running"
    follower.tick(last_s + 0.5)
    assert follower.state == "coasting"
    assert follower.beat(last_s + 1.0).at(last_s + 1.0) == pytest.approx(95 / 24 + 2.0, abs=1e-6)
    follower.tick(last_s + COAST_S + 0.01)
    held = follower.beat(last_s + 9.0)
    assert (follower.state, held.rate) == ("holding", 0.0)
    assert held.place == pytest.approx(95 / 24 + 2.0 * COAST_S, abs=1e-6)
    assert kinds(follower) == ["coast", "hold"]


def test_ticks_lost_on_the_way_are_made_up_for_once_the_old_tempo_is_heard_again():
    follower, end_s, period_s = running()
    follower.tick(end_s + 30 * period_s)
    back_s = end_s + 36 * period_s
    ticks(follower, 24, period_s, back_s)
    at_s = back_s + 23 * period_s
    assert follower.beat(at_s).at(at_s) == pytest.approx((96 + 36 + 23) / 24, abs=1e-6)
    assert (follower.state, kinds(follower)) == ("running", ["coast", "again"])


def test_a_tempo_that_falls_to_a_sixth_at_once_is_no_loss_of_ticks():
    follower, end_s, period_s = running()
    slow_s = 6.0 * period_s
    ticks(follower, 24, slow_s, end_s - period_s + slow_s)
    at_s = end_s - period_s + 24 * slow_s
    assert follower.beat(at_s).at(at_s) == pytest.approx((95 + 24) / 24, abs=1e-6)
    assert follower.beat(at_s).rate == pytest.approx(1 / (TICKS * slow_s), rel=1e-6)


def test_after_a_hold_the_clock_goes_on_from_where_it_was_held():
    follower, end_s, period_s = running()
    follower.tick(end_s + 0.5)
    follower.tick(end_s + 5.0)
    held = follower.beat(end_s + 5.0).place
    ticks(follower, 13, period_s, end_s + 6.0)
    at_s = end_s + 6.0 + 12 * period_s
    assert follower.beat(at_s).at(at_s) == pytest.approx(held + 0.5, abs=1 / 48 + 1e-6)
    assert (follower.state, kinds(follower)[-1]) == ("running", "again")


def test_a_clock_at_10_khz_moves_nothing_and_is_told_and_a_sane_one_is_followed_again():
    follower, end_s, period_s = running()
    ticks(follower, 10_000, 1e-4, end_s)
    beat = follower.beat(end_s + 1.0)
    assert (follower.state, beat.rate) == ("wild", 0.0)
    assert beat.place < 96 / 24 + 1.0
    assert kinds(follower) == ["wild"]
    ticks(follower, 300, period_s, end_s + 1.02)
    assert follower.state == "running"
    assert follower.beat(end_s + 8.0).rate == pytest.approx(2.0, rel=1e-3)


def test_a_clock_whose_moments_run_backwards_is_counted_and_stands():
    follower, end_s, period_s = running()
    ticks(follower, 200, -period_s, end_s)
    assert follower.backwards == 199
    assert follower.beat(end_s).rate == 0.0
    assert len(follower._steady) <= 96


@given(
    st.lists(
        st.tuples(st.sampled_from(["clock"] * 5 + ["start", "stop", "continue", "songpos"]), st.floats(-0.01, 3.0)), max_size=80
    )
)
def test_whatever_comes_the_place_is_finite_and_the_tempo_one_that_a_score_may_have(heard):
    follower, now = ClockFollower(), 100.0
    for what, wait in heard:
        now += wait
        say(follower, what, now, 7)
        follower.tick(now)
        beat = follower.beat(now)
        if beat is not None:
            assert np.isfinite(beat.at(now))
            assert beat.rate >= 0.0
