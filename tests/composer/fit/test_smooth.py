"""Noise found and taken away, turns found."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.fit.smooth import levelled, noise, smoothed, turns

TIME = np.arange(4000) / 200.0
CORNERS = np.interp(TIME, [0, 1, 5, 6, 10, 11, 11.05, 15, 15.05, 20], [0, 0, 400, 400, 50, 50, 300, 300, 100, 100])


def noisy(level, seed):
    return CORNERS + level * np.random.default_rng(seed).standard_normal(len(CORNERS))


def test_the_noise_of_a_signal_is_found_whatever_its_trend():
    found = [noise(noisy(0.6, seed)) for seed in range(20)]
    assert abs(np.mean(found) - 0.6) < 0.02


def test_a_signal_without_noise_has_none():
    assert noise(CORNERS) < 1e-9


def test_a_signal_without_noise_stays_as_it_is():
    np.testing.assert_allclose(smoothed(CORNERS), CORNERS, atol=1e-6)


def test_smoothing_leaves_a_quarter_of_the_noise_along_ramps_and_stands():
    left = np.mean([np.std((smoothed(noisy(0.6, seed)) - CORNERS)[300:900]) for seed in range(10)])
    assert left < 0.25 * 0.6


def test_smoothing_keeps_quick_steps_where_they_are():
    smooth = smoothed(noisy(0.6, 3))
    during = (TIME > 10.99) & (TIME < 11.06)
    assert np.max(np.abs(smooth - CORNERS)[during]) < 4.0 * 0.6


def test_turns_are_found_where_the_signal_turns_and_nowhere_else():
    found = turns(smoothed(noisy(0.6, 4)), 3.0)
    # The start, and the stands at 0, 400, 50 and 300: within each stand anywhere.
    assert len(found) == 5 and found[0] == 0
    for row, (low, high) in zip(found[1:], ((0.0, 1.1), (4.9, 6.1), (9.9, 11.01), (11.0, 15.05)), strict=True):
        assert low <= TIME[row] <= high


def test_a_signal_that_stays_within_the_least_turns_nowhere():
    assert turns(0.4 * np.sin(TIME), 1.0).tolist() == [0]


@given(st.lists(st.floats(-100, 100), min_size=2, max_size=60), st.floats(0.1, 20))
def test_turns_go_up_and_down_in_turn_by_the_least_at_least(values, least):
    values = np.array(values)
    found = turns(values, least)
    steps = np.diff(values[found])[1:] if found[0] == 0 and len(found) > 2 else np.zeros(0)
    assert np.all(np.diff(found) > 0)
    assert np.all(np.abs(steps) > least)
    assert np.all(steps[1:] * steps[:-1] < 0)


def test_the_level_of_a_stand_is_not_the_highest_of_its_noise():
    ramp, stand = np.linspace(0.0, 400.0, 200), np.full(100, 400.0)
    truth = np.concatenate([ramp, stand, ramp[::-1]])
    rise = []
    for seed in range(20):
        # About a sixth of the sensor's noise is left on a stand once smoothed.
        left = truth + 0.1 * np.random.default_rng(seed).standard_normal(500)
        flat = levelled(left, turns(left, 3.0), 0.6)
        rise.append((left.max() - 400.0, flat.max() - 400.0))
        assert np.all(np.abs(flat - left) < 0.7)
    highest, level = np.mean(rise, axis=0)
    assert highest > 0.2 and abs(level) < 0.05


@settings(deadline=None)
@given(st.lists(st.floats(-1e6, 1e6), min_size=1, max_size=200))
def test_smoothing_gives_finite_values_of_the_same_number(values):
    smooth = smoothed(np.array(values))
    assert smooth.shape == (len(values),) and np.isfinite(smooth).all()
