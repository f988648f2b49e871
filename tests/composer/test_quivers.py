"""Quivers: what they add, and that nothing jumps."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.motion import Cursor, rate_at, strain_at
from composer.quivers import Quivers, over, pairs, swing, swing_rate
from composer.tracks import HOLD, MOVE, Tracks

hertz = st.floats(0.01, 100.0)
swings = st.floats(0.01, 40.0)
AMPLITUDE = 0.02


def at_shares(frequency: float, periods: float, shares: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Strain over the amplitude, and rate over the greatest rate."""
    angular, lasts = 2.0 * np.pi * frequency, periods / frequency
    found = (of(angular, AMPLITUDE, shares * lasts, lasts) for of in (swing, swing_rate))
    return tuple(value / scale for value, scale in zip(found, (AMPLITUDE, angular * AMPLITUDE), strict=True))


@given(hertz, swings)
def test_a_quiver_begins_and_ends_with_nothing_and_is_nothing_outside(frequency, periods):
    strain, rate = at_shares(frequency, periods, np.array([-0.5, 0.0, 1.0, 1.5]))
    assert strain.tolist() == [0.0, 0.0, 0.0, 0.0]
    assert rate[1] == 0.0


@given(hertz, swings)
def test_its_rate_is_never_more_than_that_of_its_sine(frequency, periods):
    assert np.abs(at_shares(frequency, periods, np.linspace(0.0, 1.0, 4001))[1]).max() <= 1.0 + 1e-12


@given(hertz, swings)
def test_strain_and_rate_stay_within_the_border_that_the_limits_go_by(frequency, periods):
    strain, rate = at_shares(frequency, periods, np.linspace(0.0, 1.0, 4001))
    left = np.sqrt(np.maximum(1.0 - rate**2, 0.0))
    assert np.all(strain <= 0.5 * (1.0 + left) + 1e-7)
    assert np.all(strain >= np.where(rate > 0.0, -0.5 * (1.0 + left), -left) - 1e-7)


@given(hertz, st.floats(0.5, 20.0))
def test_it_accelerates_by_at_most_twice_its_sine_and_by_no_less_in_fading_in(frequency, periods):
    angular, lasts = 2.0 * np.pi * frequency, periods / frequency
    gone = np.linspace(0.0, lasts, 20001)
    rate = swing_rate(angular, 1.0, gone, lasts)
    bend = np.abs(np.diff(rate) / np.diff(gone)) / angular**2
    assert 1.9 < bend.max() <= 2.0 + 1e-6


@given(hertz, swings)
def test_its_rate_is_the_slope_of_its_strain(frequency, periods):
    shares = np.linspace(0.0, 1.0, 40001)
    strain, rate = at_shares(frequency, periods, shares)
    walked = np.concatenate([[0.0], np.cumsum(0.5 * (rate[1:] + rate[:-1]) * np.diff(shares))]) * 2.0 * np.pi * periods
    np.testing.assert_allclose(strain, walked, atol=1e-4)


def test_between_its_fades_it_is_the_sine_itself():
    time = np.linspace(0.25, 1.75, 100)
    np.testing.assert_allclose(swing(2.0 * np.pi, 0.02, time, 2.0), 0.02 * np.sin(2.0 * np.pi * time), atol=1e-15)


CURVE = np.array([[0, 0.2, 0, 0, 0, 0], [0.2, 0, 0, 0, 0, 0], [0.2, -0.1, 0, 0, 0, 0], [0.1] + [0.0] * 5, [0.0] * 6])
TRACKS = Tracks(
    first=np.array([0, 4, 5]),
    time_s=np.array([0.0, 1.0, 3.0, 4.0, 0.0]),
    curve=CURVE,
    manner=np.array([MOVE, MOVE, MOVE, HOLD, HOLD], np.int8),
    shape=np.array([1, -1, 1, -1, -1], np.int8),
    line=np.zeros(5, np.int32),
    phrase_line=np.zeros(5, np.int32),
    duration_s=5.0,
    quivers=Quivers(np.array([1, 1]), np.array([2, 3]), np.array([2.0, 3.0]), np.array([0.01, 0.02])),
)


def test_quivers_are_found_by_the_segments_beneath_them():
    segment, which = pairs(TRACKS.quivers)
    assert (segment.tolist(), which.tolist()) == ([1, 1, 2], [0, 1, 1])
    by_segment = over(TRACKS.quivers, TRACKS.time_s)
    assert by_segment.first.tolist() == [0, 0, 2, 3, 3, 3]
    assert over(Quivers(*(np.empty(0, int),) * 2, *(np.empty(0),) * 2), TRACKS.time_s) is None


def test_motion_adds_every_quiver_over_the_whole_of_its_stretch(make_rig):
    abilities = abilities_of(make_rig(2))
    time = np.linspace(0.0, 5.0, 501)
    bare = np.interp(time, [0, 1, 3, 4, 5], [0, 0.2, 0.2, 0.1, 0.1])
    added = swing(4.0 * np.pi, 0.01, time - 1.0, 2.0) + swing(6.0 * np.pi, 0.02, time - 1.0, 3.0)
    np.testing.assert_allclose(strain_at(TRACKS, abilities, time), [bare + added, 0.0 * time], atol=1e-14)


def test_a_cursor_gives_what_the_grid_gives_in_any_order(make_rig):
    abilities = abilities_of(make_rig(2))
    times = np.concatenate([np.linspace(0.0, 5.0, 101), [2.2, 0.3, 3.99, 1.0]])
    strain, rate = strain_at(TRACKS, abilities, times), rate_at(TRACKS, abilities, times)
    cursor = Cursor(TRACKS, abilities)
    for column, time in enumerate(times):
        now = cursor.at(float(time))
        assert (now[0].tolist(), now[1].tolist()) == (strain[:, column].tolist(), rate[:, column].tolist())
