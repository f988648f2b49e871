from random import Random

import pytest

from player.wire.clock import TURN, WANDER_PPM, Clock


def exchanges(clock, *, drift_ppm, jitter_s, seconds=30.0, every_s=0.05, device_start=TURN - 3e6, seed=1, from_s=100.0):
    """Ping through a line with random delay each way; yields (host time, truth in µs) after each exchange."""
    chance, t = Random(seed), from_s
    rate = 1e6 * (1.0 + drift_ppm * 1e-6)
    while t < from_s + seconds:
        there = t + 2e-4 + chance.random() * jitter_s
        back = there + 2e-4 + chance.random() * jitter_s
        assert clock.heard(t, back, int(device_start + (there - from_s) * rate) % TURN)
        yield back, device_start + (back - from_s) * rate
        t += every_s


def apart(one_us, other_us):
    return abs((one_us - other_us + TURN / 2) % TURN - TURN / 2)


@pytest.mark.parametrize("drift_ppm", [0.0, 200.0, -200.0, 10_000.0, -10_000.0])
@pytest.mark.parametrize("jitter_s", [1e-4, 1e-3, 5e-3])
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_the_truth_is_within_the_bound_from_the_first_exchange_on_across_the_wrap(drift_ppm, jitter_s, seed):
    clock = Clock()
    for at_s, truth_us in exchanges(clock, drift_ppm=drift_ppm, jitter_s=jitter_s, seed=seed):
        assert apart(clock.device_us(at_s), truth_us) <= clock.bound_us(at_s)
        later_us = truth_us + 0.02 * (1e6 + drift_ppm)
        assert apart(clock.device_us(at_s + 0.02), later_us) <= clock.bound_us(at_s + 0.02)


def test_after_a_minute_of_1_ms_jitter_and_200_ppm_the_error_is_under_200_us():
    clock, worst_us = Clock(), 0.0
    for at_s, truth_us in exchanges(clock, drift_ppm=200.0, jitter_s=1e-3, seconds=90.0, every_s=0.1):
        if at_s > 160.0:
            worst_us = max(worst_us, apart(clock.device_us(at_s), truth_us))
    assert 0.0 < worst_us < 200.0
    assert clock.drift_ppm == pytest.approx(200.0, abs=20.0)


def test_nothing_is_known_before_the_first_exchange():
    clock = Clock()
    assert not clock.known
    assert clock.bound_us(5.0) == float("inf")


def test_the_bound_grows_with_the_time_since_the_last_exchange():
    clock = Clock()
    at_s, _ = list(exchanges(clock, drift_ppm=50.0, jitter_s=1e-3, seconds=5.0))[-1]
    assert clock.bound_us(at_s + 60.0) > clock.bound_us(at_s) + 60.0


def test_a_device_that_starts_anew_is_noticed_and_followed_from_there():
    clock = Clock()
    for _ in exchanges(clock, drift_ppm=0.0, jitter_s=1e-4, seconds=5.0):
        pass
    assert not clock.heard(200.0, 200.001, 1_000)
    assert clock.resets == 1
    assert apart(clock.device_us(200.0005), 1_000) <= clock.bound_us(200.0005)


def test_a_pong_that_comes_very_late_is_no_reset():
    clock = Clock()
    for at_s, truth_us in exchanges(clock, drift_ppm=0.0, jitter_s=1e-4, seconds=5.0):
        last_s, last_us = at_s, truth_us
    assert clock.heard(last_s, last_s + 5.0, int(last_us + 50) % TURN)
    assert clock.resets == 0
    assert apart(clock.device_us(last_s), last_us) < 200.0


def test_a_due_time_is_never_0_which_would_mean_now():
    clock = Clock()
    clock.heard(10.0, 10.0, TURN - 1_000_000)
    assert clock.due_us(11.0) == 1
    assert clock.due_us(11.0001) == 100


def test_a_reading_of_the_device_is_told_in_time_of_the_host():
    clock = Clock()
    for at_s, truth_us in exchanges(clock, drift_ppm=100.0, jitter_s=1e-4, seconds=10.0):
        assert clock.host_s(int(truth_us) % TURN) == pytest.approx(at_s, abs=clock.bound_us(at_s) * 1e-6 + 2e-6)


def test_a_first_exchange_that_was_held_up_on_its_way_back_makes_no_jump_of_the_next():
    clock = Clock()
    # The board read its clock at once; the answer lay about for 0.4 s before it was heard.
    assert clock.heard(10.0, 10.4, 1_000_100)
    assert clock.heard(10.5, 10.5002, 1_500_100)
    assert clock.resets == 0 and abs(clock.device_us(10.5) - 1_500_000) < 1000


def test_a_line_without_jitter_and_a_steady_drift_leave_no_more_doubt_than_the_wander_of_an_oscillator():
    clock = Clock()
    at_s, _ = list(exchanges(clock, drift_ppm=150.0, jitter_s=0.0, seconds=10.0))[-1]
    doubt_ppm = (clock.bound_us(at_s + 100.0) - clock.bound_us(at_s + 50.0)) / 50.0
    assert doubt_ppm == pytest.approx(WANDER_PPM, abs=0.5)
