import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.inputs.beat import Beat, Steady


@given(st.floats(-100, 100), st.floats(0.01, 20), st.floats(0, 1000))
def test_when_is_the_inverse_of_at(place, rate, moment):
    beat = Beat(place, 3.0, rate)
    assert beat.when(beat.at(moment)) == pytest.approx(moment, abs=1e-6)


@given(st.floats(0, 100), st.floats(0.02, 16), st.sampled_from([Fraction(1), Fraction(1, 2), Fraction(1, 3), Fraction(4)]))
def test_the_next_step_is_never_past_and_less_than_a_step_away(now, rate, step):
    beat = Beat(0.25, 1.0, rate)
    starts = beat.next_s(now, step)
    assert now <= starts <= now + float(step) / rate + 1e-6
    assert beat.at(starts) / float(step) == pytest.approx(round(beat.at(starts) / float(step)), abs=1e-5)


def test_where_time_stands_nothing_is_waited_for():
    assert Beat(1.0, 0.0, 0.0).next_s(5.0, Fraction(1)) == 5.0
    assert Beat(1.0, 0.0, 0.0).when(2.0) == math.inf


def test_the_line_is_numpy_s_least_squares_line():
    rng = np.random.default_rng(3)
    ticks = np.arange(50)
    times = 1000.0 + 0.02 * ticks + rng.uniform(-0.001, 0.001, 50)
    steady = Steady()
    for tick, at in zip(ticks, times, strict=True):
        steady.add(int(tick), float(at))
    slope, start = np.polyfit(ticks, times - 1000.0, 1)
    tick, at, found = steady.line()
    assert found == pytest.approx(slope, rel=1e-9)
    assert at - 1000.0 == pytest.approx(start + slope * tick, abs=1e-9)


@pytest.mark.parametrize("seed", range(20))
def test_jitter_alone_never_shortens_its_memory(seed):
    rng = np.random.default_rng(seed)
    steady = Steady()
    for tick in range(500):
        steady.add(tick, tick / 48 + rng.uniform(-0.001, 0.001))
        if tick > 12:
            steady.line()
    assert len(steady) == 96


def test_a_turn_of_the_tempo_is_forgotten_before():
    steady = Steady()
    for tick in range(96):
        steady.add(tick, tick * 0.02)
    for tick in range(1, 13):
        steady.add(95 + tick, 95 * 0.02 + tick * 0.03)
        steady.line()
    assert steady.line()[2] == pytest.approx(0.03, rel=1e-6)


def test_moments_that_do_not_pass_make_no_line():
    steady = Steady()
    assert steady.line() is None
    steady.add(0, 1.0)
    steady.add(1, 1.0)
    assert steady.line() is None
    steady.clear()
    assert len(steady) == 0
