"""Wanted against sensed."""

import numpy as np
import pytest

from player.engine.errors import KEEP, Errors


def wanted(count=10):
    errors = Errors(2)
    for tick in range(count):
        errors.want(0.1 * tick, np.array([0.01 * tick, 0.0]), float(tick))
    return errors


def test_the_largest_error_is_found_with_its_fiber_and_place():
    errors = wanted()
    errors.sense(0.3, np.array([0, 1]), np.array([0.031, 0.0]))
    errors.sense(0.5, np.array([1]), np.array([0.2]))
    errors.sense(0.6, np.array([0]), np.array([0.06]))
    assert errors.worst.fiber == 1 and errors.worst.error == pytest.approx(0.2) and errors.worst.position_s == 5.0
    assert errors.sensed == 4


def test_between_two_ticks_the_straight_line_is_what_was_wanted():
    errors = wanted()
    errors.sense(0.35, np.array([0]), np.array([0.035]))
    assert errors.worst.error == pytest.approx(0.0, abs=1e-12)


def test_what_was_sensed_before_or_after_all_wants_says_nothing():
    errors = wanted()
    errors.sense(-1.0, np.array([0]), np.array([0.3]))
    errors.sense(5.0, np.array([0]), np.array([0.3]))
    assert errors.worst is None


def test_it_remembers_a_bounded_number_of_ticks():
    errors = wanted(3 * KEEP)
    errors.sense(0.1, np.array([0]), np.array([0.3]))
    assert errors.worst is None
    errors.sense(0.1 * (3 * KEEP - 5), np.array([0]), np.array([0.01 * (3 * KEEP - 5)]))
    assert errors.worst.error == pytest.approx(0.0, abs=1e-9)
