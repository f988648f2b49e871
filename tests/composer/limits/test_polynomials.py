"""Roots and extremes against numpy's companion matrices and dense sampling."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from composer.limits import polynomials
from composer.limits.polynomials import derivative, extremes, roots, value
from composer.shapes import PROGRESS

coefficients = st.sampled_from([0.0, 1.0, -1.0]) | st.floats(-10.0, 10.0).map(lambda x: round(x, 6))
curves = st.integers(1, 6).flatmap(lambda terms: arrays(float, (4, terms), elements=coefficients))


@given(curves)
def test_value_agrees_with_horner_row_by_row(curve):
    u = np.linspace(0.0, 1.0, 7)
    expected = np.array([np.polyval(row[::-1], u) for row in curve])
    assert value(curve, np.tile(u, (4, 1))) == pytest.approx(expected, abs=1e-12)


@given(curves)
def test_every_change_of_sign_lies_at_a_root_that_was_found(curve):
    grid = np.linspace(0.0, 1.0, 501)
    found = roots(curve)
    for row, mine in zip(curve, found, strict=True):
        heights = np.polyval(row[::-1], grid)
        crossing = np.flatnonzero((np.sign(heights[:-1]) * np.sign(heights[1:]) < 0) & (np.abs(np.diff(heights)) > 1e-9))
        for k in crossing:
            assert np.any((mine >= grid[k] - 1e-12) & (mine <= grid[k + 1] + 1e-12))
        for root in mine[~np.isnan(mine)]:
            assert abs(np.polyval(row[::-1], root)) <= 1e-12 * (1.0 + np.abs(row).sum())


def test_all_five_roots_of_a_quintic_are_found():
    wanted = np.array([0.1, 0.25, 0.5, 0.8, 0.9])
    assert roots(np.poly(wanted)[::-1][None]) == pytest.approx(wanted[None], abs=1e-9)


def test_a_constant_has_no_roots_even_at_zero():
    assert np.all(np.isnan(roots(np.array([[0.0, 0.0, 0.0], [2.0, 0.0, 0.0]]))))


def test_a_root_at_either_end_counts():
    found = roots(np.array([[0.0, 1.0], [-1.0, 1.0]]))
    assert found.tolist() == [[0.0], [1.0]]


@given(curves)
def test_extremes_bound_every_sample_and_are_reached(curve):
    low, high = extremes(curve)
    samples = value(curve, np.tile(np.linspace(0.0, 1.0, 2001), (4, 1)))
    scale = 1e-12 + 1e-12 * np.abs(curve).sum(axis=1)
    assert np.all(samples.max(axis=1) <= high + scale)
    assert np.all(samples.min(axis=1) >= low - scale)
    step = 1e-3 * np.abs(derivative(curve)).sum(axis=1) + scale if curve.shape[1] > 1 else scale
    assert np.all(samples.max(axis=1) >= high - step)
    assert np.all(samples.min(axis=1) <= low + step)


def test_the_minimum_jerk_profile_peaks_at_fifteen_eighths(outside):
    smooth = np.array([[0.0, 0.0, 0.0, 10.0, -15.0, 6.0]])
    speed = derivative(smooth)
    assert extremes(speed)[1] == pytest.approx([outside["minimum_jerk"]["peak_speed"]], rel=1e-14)
    assert extremes(derivative(speed))[1] == pytest.approx([outside["minimum_jerk"]["peak_acceleration"]], rel=1e-14)


def test_roots_on_the_border_double_ones_too_take_no_more_steps_than_those_within(monkeypatch):
    calls = []
    monkeypatch.setattr(polynomials, "value", lambda curve, u: calls.append(u) or value(curve, u))
    smooth = np.array(PROGRESS["smooth"])
    for shift in (0.0, 0.3, -0.9):
        for curve in (smooth, -smooth, derivative(smooth[None])[0]):
            calls.clear()
            shifted = curve.copy()
            shifted[0] += shift
            polynomials.roots(shifted[None])
            assert len(calls) <= 40
