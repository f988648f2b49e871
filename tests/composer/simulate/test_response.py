"""Delayed commands."""

import numpy as np
import pytest

from composer.simulate.response import Response


def test_the_stretches_of_a_tick_add_up_to_it_and_each_fiber_has_its_own_delay():
    response = Response(np.array([0.003, 0.008]), np.zeros(2))
    seen = [
        [(round(lasts, 9), command.tolist()) for lasts, command in response.hold(0.005, np.array([n, n]))] for n in (1.0, 2.0)
    ]
    assert seen == [
        [(0.003, [0.0, 0.0]), (0.002, [1.0, 0.0])],
        [(0.003, [1.0, 0.0]), (0.002, [2.0, 1.0])],
    ]


def test_without_delay_a_command_is_in_force_at_once():
    response = Response(np.zeros(1), np.zeros(1))
    assert [(lasts, command.tolist()) for lasts, command in response.hold(0.01, np.array([0.7]))] == [(0.01, [0.7])]


def test_a_delay_of_whole_ticks_never_splits_one_however_long_it_runs():
    response = Response(np.full(3, 0.008), np.zeros(3))
    for number in range(5000):
        stretches = [(lasts, command[0]) for lasts, command in response.hold(0.002, np.full(3, float(number)))]
        assert stretches == [(pytest.approx(0.002), max(0.0, number - 4.0))]


def test_a_command_changed_after_it_was_sent_is_not_changed_on_its_way():
    response, command = Response(np.full(1, 0.01), np.zeros(1)), np.array([1.0])
    list(response.hold(0.01, command))
    command[0] = 5.0
    assert [stretch[1].tolist() for stretch in response.hold(0.01, command)] == [[1.0]]
