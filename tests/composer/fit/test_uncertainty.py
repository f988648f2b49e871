"""How well data tell parameters, on straight lines where the answer is known."""

import numpy as np
import pytest
from scipy.optimize import least_squares

from composer.fit.uncertainty import hanging_together, robust_scale, uncertainty

NONE = np.zeros((0, 400))
PLACE = np.linspace(-1.0, 1.0, 400)
LINE = np.column_stack([np.ones(400), PLACE])


def test_white_residuals_count_row_by_row():
    rng = np.random.default_rng(0)
    found = [hanging_together(rng.standard_normal(2000)) for _ in range(20)]
    assert 1.0 <= np.mean(found) < 1.3


def test_residuals_that_hang_together_count_as_fewer():
    rng = np.random.default_rng(0)
    found = []
    for _ in range(20):
        white, red = rng.standard_normal(20_000), [0.0]
        for kick in white:
            red.append(0.8 * red[-1] + kick)
        found.append(hanging_together(np.array(red)))
    # (1 + r) / (1 − r) of a chain that keeps r of itself.
    assert np.mean(found) == pytest.approx(9.0, rel=0.15)


def test_residuals_all_alike_count_as_they_are():
    assert hanging_together(np.zeros(100)) == 1.0


def test_the_robust_scale_is_that_of_the_bulk():
    values = np.random.default_rng(0).standard_normal(10_000)
    values[:500] += 100.0
    assert robust_scale(values) == pytest.approx(1.05, abs=0.06)


def test_intervals_of_a_line_with_outliers_hold_at_once_as_often_as_they_say():
    # 400 repeats at 0.95: fewer than 364 would come by chance less than once in a thousand runs; the seed is fixed.
    rng = np.random.default_rng(5)
    held = 0
    for _ in range(400):
        wrong = rng.standard_normal(400) * np.where(rng.random(400) < 0.05, 20.0, 1.0)
        data = LINE @ np.array([1.0, 2.0]) + wrong
        theta = least_squares(lambda at, data=data: (LINE @ at - data) / 1.5, np.zeros(2), loss="soft_l1").x
        sure = uncertainty(LINE @ theta - data, LINE, 1.5, 0.95, NONE)
        held += np.all(np.abs(theta - [1.0, 2.0]) <= sure.half)
    assert held >= 364


def test_two_columns_alike_are_correlated_and_hardly_told():
    residual = np.random.default_rng(1).standard_normal(400)
    near = np.column_stack([PLACE, PLACE + 1e-3 * np.cos(9.0 * PLACE)])
    sure = uncertainty(residual, near, 1.5, 0.95, NONE)
    alone = uncertainty(residual, near[:, :1], 1.5, 0.95, NONE)
    assert sure.correlation[0, 1] < -0.99
    assert sure.half[0] > 50.0 * alone.half[0]


def test_a_column_of_nothing_is_blind():
    residual = np.random.default_rng(1).standard_normal(400)
    sure = uncertainty(residual, np.column_stack([PLACE, np.zeros(400)]), 1.5, 0.95, NONE)
    assert sure.blind.tolist() == [False, True]
    assert np.isfinite(sure.half).all() and sure.half[1] > 1e6


def test_noise_of_the_drive_widens_the_intervals():
    rng = np.random.default_rng(1)
    residual = rng.standard_normal(400)
    quiet = uncertainty(residual, LINE, 1.5, 0.95, NONE)
    # Every draw moves the whole line up or down by 1: so much is added to the first parameter, nothing to the second.
    shaken = np.where(rng.random(60) < 0.5, 1.0, -1.0)[:, None] * np.ones(400)
    loud = uncertainty(residual, LINE, 1.5, 0.95, shaken)
    assert loud.half[0] > 2.0 and loud.half[1] == pytest.approx(quiet.half[1])


def test_residuals_of_zero_give_finite_numbers():
    sure = uncertainty(np.zeros(400), LINE, 1e-7, 0.95, NONE)
    assert np.isfinite(sure.half).all() and np.isfinite(sure.correlation).all()
