"""The count-in against the tempo map worked out by hand."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.score.tempo import TempoMap
from composer.warp import Warp
from player.window.count_in import beat_of, count_in


def steady(a_minute=60.0, of=4.0):
    zero = np.zeros(1)
    return TempoMap(zero, zero, np.array([a_minute / 60.0]), zero, zero, zero, np.array([of]))


def ramp(from_a_minute, to_a_minute, counts):
    """A tempo that changes evenly by counts, over so many of them, then stays."""
    rate, end = from_a_minute / 60.0, to_a_minute / 60.0
    slope = (end - rate) / counts
    end_s = math.log(end / rate) / slope
    return TempoMap(
        np.array([0.0, counts]), np.array([0.0, end_s]), np.array([rate, end]), np.array([slope, 0.0]), np.zeros(1),
        np.zeros(1), np.array([4.0]),
    )  # fmt: skip


def test_at_a_steady_tempo_counts_are_seconds_times_the_tempo():
    left = count_in(10.0, 13.0, steady(120.0))
    assert (left.counts, left.seconds, left.figure, left.unit) == (6.0, 3.0, 6, "counts")


def test_more_than_two_bars_off_bars_are_told():
    assert count_in(0.0, 8.5, steady()).unit == "bars"
    assert count_in(0.0, 8.5, steady()).figure == 3
    assert count_in(0.0, 8.0, steady()).unit == "counts"
    assert count_in(0.0, 8.0, steady()).figure == 8


@given(st.floats(40.0, 200.0), st.floats(40.0, 200.0), st.floats(0.0, 1.0), st.floats(0.0, 1.0))
def test_in_a_ramp_the_counts_left_are_those_of_its_closed_form(begin, end, a, b):
    if abs(begin - end) < 1.0:
        end = begin + 5.0
    counts, tempo = 16.0, ramp(begin, end, 16.0)
    here, there = sorted((a * counts, b * counts))
    rate, slope = begin / 60.0, (end - begin) / 60.0 / counts
    # dt = dc / (rate + slope c), so t(c) = ln(1 + slope c / rate) / slope.
    at = [math.log1p(slope * c / rate) / slope for c in (here, there)]
    left = count_in(at[0], at[1], tempo)
    assert left.counts == pytest.approx(there - here, abs=1e-6)
    assert left.bars == pytest.approx((there - here) / 4.0, abs=1e-6)


@given(st.floats(0.0, 100.0), st.floats(0.0, 20.0))
def test_the_figure_is_the_least_whole_number_not_below_what_is_left(here, way):
    left = count_in(here, here + way, steady(93.0))
    value = left.bars if left.unit == "bars" else left.counts
    assert left.figure - 1 <= value <= left.figure + 1e-6


def test_a_retimed_piece_is_counted_by_its_score():
    # Written from 4 s to 8 s, played in twice the time.
    warp = Warp(np.array([0.0, 4.0, 8.0]), np.array([0.0, 4.0, 12.0]))
    left = count_in(6.0, 12.0, steady(), warp)
    assert (left.counts, left.seconds) == (pytest.approx(3.0), 6.0)


def test_the_beat_is_the_count_of_its_bar_across_a_change_of_meter():
    zero = np.zeros(1)
    tempo = TempoMap(
        zero, zero, np.ones(1), zero, np.array([0.0, 8.0]), np.array([0.0, 2.0]), np.array([4.0, 3.0])
    )  # fmt: skip
    assert [beat_of(at, tempo) for at in (0.0, 3.5, 4.0, 7.9, 8.0, 10.9, 11.0)] == [
        (1, 4), (4, 4), (1, 4), (4, 4), (1, 3), (3, 3), (1, 3),
    ]  # fmt: skip


def test_a_place_that_is_a_rounding_short_of_a_count_is_on_it():
    assert beat_of(3.9999999999, steady()) == (1, 4)
    assert count_in(1.0 - 1e-9, 3.0, steady()).figure == 2


def test_without_a_tempo_map_seconds_are_told():
    left = count_in(1.5, 4.0, None)
    assert (left.figure, left.unit, left.of) == (3, "seconds", 0) and math.isnan(left.counts)


def test_beyond_the_cue_nothing_is_left():
    left = count_in(5.0, 4.0, steady())
    assert (left.figure, left.seconds, left.counts) == (0, 0.0, 0.0)
