"""What sensed strain shows to be wrong, by made-up senses every 50 ms."""

import numpy as np
import pytest

from player.engine.alarms import ALARMS, DOES, Raised, Watch

EVERY_S, LASTS_S = 0.05, 8.0
FASTEST = 4.0


def wanted(at):
    """Up to 80 % within a second from 1 s on, a hold, down again from 4 s on within a second; then at rest."""
    return float(np.interp(at, [1.0, 2.0, 4.0, 5.0], [0.0, 0.8, 0.8, 0.0]))


def alarms(sensed, every_s=EVERY_S):
    """The names of all alarms, in order, where `sensed(at, wanted)` is what the sensor says."""
    watch, found = Watch(np.full(3, FASTEST)), []
    for tick in range(round(LASTS_S / every_s)):
        at = tick * every_s
        near = [wanted(at + slack) for slack in np.linspace(-0.2, 0.2, 9)]
        share = float(np.clip(sensed(at, wanted(at)), 0.0, 1.0))
        told = watch.look(at, np.array([1]), np.array([share]), np.array([min(near)]), np.array([max(near)]))
        assert all(one.fiber == 1 for one in told)
        found += [one.name for one in told]
    return found


@pytest.mark.parametrize("late_s", [0.0, 0.05, 0.15])
@pytest.mark.parametrize("off", [-0.04, 0.0, 0.04])
@pytest.mark.parametrize("every_s", [0.005, 0.05, 0.1])
def test_a_fiber_that_does_what_it_should_raises_none_late_or_a_little_off(late_s, off, every_s):
    assert alarms(lambda at, want: wanted(at - late_s) * (1.0 + off), every_s) == []


def test_a_fiber_that_falls_in_a_hold_leaks():
    assert alarms(lambda at, want: want * (0.5 ** max(0.0, at - 2.5))) == ["leak"]


@pytest.mark.parametrize("at_share", [0.0, 0.8])
def test_a_fiber_that_stands_while_it_should_move_is_stuck(at_share):
    found = alarms(lambda at, want: at_share if (at > 2.5) == (at_share > 0.0) else want)
    assert found[0] == "stuck" and set(found) == {"stuck"}


def test_a_sensor_that_goes_to_full_at_once_is_at_its_rail():
    assert alarms(lambda at, want: 1.0 if at > 5.5 else want) == ["rail"]


def test_a_sensor_that_jumps_about_is_not_believed_any_more():
    assert alarms(lambda at, want: 0.6 if at > 5.5 and round(at / EVERY_S) % 2 else want) == ["jump"]


def test_a_fiber_that_creeps_away_while_it_stands_drifts():
    watch, found = Watch(np.full(1, FASTEST)), []
    for tick in range(1200):
        share = np.array([0.5 - min(0.12, 0.004 * tick * EVERY_S)])
        found += watch.look(tick * EVERY_S, np.array([0]), share, np.array([0.5]), np.array([0.5]))
    assert found == [Raised("drift", 0)]


def test_every_alarm_does_something_that_is_known_and_says_what_to_do():
    for row in ALARMS.values():
        assert row.does in DOES and row.says and row.hint and row.seen
