"""Steady and virtual clocks."""

import signal

import pytest

from player.engine.clock import SteadyClock, VirtualClock, stamp, time_of, time_of_day


def test_a_steady_clock_never_comes_back_before_the_moment():
    clock = SteadyClock()
    for wait in (0.0, 0.0001, 0.003, 0.02):
        moment = clock.now() + wait
        assert clock.wait_until(moment) >= moment


def test_a_steady_clock_comes_back_at_once_where_the_moment_has_passed():
    clock = SteadyClock()
    now = clock.now()
    assert clock.wait_until(now - 5.0) >= now


def test_a_signal_in_mid_wait_is_handled_and_does_not_cut_it_short():
    heard = []
    before = signal.signal(signal.SIGALRM, lambda *_: heard.append(clock.now()))
    clock = SteadyClock()
    moment = clock.now() + 0.1
    signal.setitimer(signal.ITIMER_REAL, 0.02)
    try:
        back = clock.wait_until(moment)
    finally:
        signal.signal(signal.SIGALRM, before)
    assert back >= moment and heard and heard[0] < moment


def test_a_virtual_clock_is_where_it_was_told_to_wait_for():
    clock = VirtualClock(10.0)
    assert clock.wait_until(12.5) == clock.now() == 12.5
    assert clock.wait_until(3.0) == 12.5


def test_a_virtual_clock_can_be_late_as_a_busy_host_is():
    clock = VirtualClock(late=lambda moment: 0.25 if moment > 1.0 else 0.0)
    assert clock.wait_until(1.0) == 1.0
    assert clock.wait_until(2.0) == 2.25


def test_a_stamp_is_read_back_to_the_second():
    assert abs(time_of(stamp()) - time_of_day()) < 5.0
    assert time_of("1970-01-02T00:00:01Z") == 86401
    with pytest.raises(ValueError):
        time_of("yesterday")
