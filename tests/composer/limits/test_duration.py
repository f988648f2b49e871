"""Least durations against closed forms, dense sampling and each other."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.duration import duration_ceilings, least_durations, speed_range
from composer.limits.over_tables import durations_over_tables
from composer.limits.tables import rates
from composer.quivers import Quivers
from composer.shapes import NAMES
from composer.tracks import MOVE, fiber_of

FACTOR = {"linear": 1.0, "swell": 2.0, "settle": 2.0}
GRID = np.linspace(0.0, 1.0, 20001)


def _sampled(abilities, fiber, curve):
    """D_min by the rates alone, by brute force over a fine grid and every passage of a point of the table."""
    lines = [np.roots((curve - np.array([point, 0, 0, 0, 0, 0]))[::-1]) for point in abilities.strain[fiber]]
    passages = np.array([u.real for u in np.concatenate(lines) if abs(u.imag) < 1e-6 and 0.0 <= u.real <= 1.0])
    u = np.concatenate([GRID, passages])
    strain, speed = np.polyval(curve[::-1], u), np.polyval(np.polyder(curve[::-1]), u)
    return float((np.abs(speed) / rates(abilities, np.full(len(u), fiber), strain, speed > 0.0)).max())


@pytest.mark.parametrize("shape", ["linear", "swell", "settle", "smooth"])
def test_a_named_shape_needs_its_peak_speed_times_distance_over_rate(shape, make_rig, make_tracks, outside):
    abilities = abilities_of(make_rig(1, fill=0.6, exhaust=0.3))
    tracks = make_tracks([(1.0, 0.24, shape), (1.0, 0.06, shape)])
    factor = FACTOR.get(shape, outside["minimum_jerk"]["peak_speed"])
    assert least_durations(tracks, abilities) == pytest.approx([factor * 0.24 / 0.6, factor * 0.18 / 0.3, 0.0], rel=1e-14)


def test_an_acceleration_limit_lengthens_a_short_move(make_rig, make_tracks, outside):
    abilities = abilities_of(make_rig(1, fill=0.6, accel=2.0))
    tracks = make_tracks([(1.0, 0.01, "smooth"), (1.0, 0.02, "linear")])
    peak = outside["minimum_jerk"]["peak_acceleration"]
    assert least_durations(tracks, abilities) == pytest.approx([np.sqrt(peak * 0.01 / 2.0), 0.01 / 0.6, 0.0], rel=1e-12)


def test_a_move_both_ways_obeys_each_directions_rate(make_rig, make_tracks):
    abilities = abilities_of(make_rig(1, fill=0.6, exhaust=0.3))
    up_and_down = [0.0, 0.8, -0.8, 0.0, 0.0, 0.0]
    assert least_durations(make_tracks([(1.0, up_and_down)]), abilities)[0] == pytest.approx(0.8 / 0.3)
    assert least_durations(make_tracks([(1.0, -np.array(up_and_down))]), abilities)[0] == pytest.approx(0.8 / 0.3)


def test_holds_need_no_time_and_jumps_need_for_ever_unless_too_small_for_the_drive(make_rig, make_tracks):
    abilities = abilities_of(make_rig(1, stroke=0.3))
    tracks = make_tracks([(0.0, 0.1, "step"), (2.0, 0.1, "hold"), (0.0, 0.1 + 0.29 / 65535, "step")])
    assert least_durations(tracks, abilities).tolist() == [np.inf, 0.0, 0.0, 0.0]


def test_sudden_needs_the_integral_over_the_rate_table(make_abilities, make_tracks):
    abilities = make_abilities(([0.0, 1.0], [1.0, 3.0], [2.0, 2.0]))
    tracks = make_tracks([(1.0, 1.0, "sudden"), (1.0, 0.0, "sudden")])
    assert least_durations(tracks, abilities) == pytest.approx([np.log(3.0) / 2.0, 0.5, 0.0], rel=1e-14)


def test_a_linear_move_over_a_table_is_held_up_by_its_slowest_strain(make_abilities, make_tracks):
    abilities = make_abilities(([0.0, 0.1, 0.11, 0.12, 0.3], [1.0, 1.0, 0.01, 1.0, 1.0], [1.0] * 5))
    tracks = make_tracks([(1.0, 0.3, "linear"), (1.0, 0.2, "linear")])
    assert least_durations(tracks, abilities) == pytest.approx([30.0, 0.1, 0.0], rel=1e-12)


def test_a_score_that_repeats_itself_gets_the_same_times_as_each_move_alone(make_abilities, make_tracks):
    abilities = make_abilities(([0.0, 0.1, 0.3], [1.0, 0.4, 0.2], [0.1, 0.5, 0.6]))
    once = [(1.0, 0.3, "smooth"), (1.0, 0.05, "settle"), (1.0, 0.2, "swell"), (1.0, 0.0, "linear")]
    alone = least_durations(make_tracks(once), abilities)[:4]
    assert least_durations(make_tracks(once * 50), abilities)[:-1].reshape(50, 4) == pytest.approx(np.tile(alone, (50, 1)))
    assert least_durations(make_tracks(once * 50), abilities, [5, 2]).tolist() == [alone[1], alone[2]]


rate = st.floats(0.02, 2.0)
table = st.tuples(st.lists(st.floats(0.02, 0.1), min_size=8, max_size=8), *[st.lists(rate, min_size=9, max_size=9)] * 2)
target = st.floats(0.0, 0.4).map(lambda x: round(x, 6))
wild = st.lists(st.floats(-0.5, 0.5).map(lambda x: round(x, 6)), min_size=6, max_size=6)
moves = st.lists(
    st.tuples(st.just(1.0), target, st.sampled_from(["smooth", "linear", "swell", "settle"])) | st.tuples(st.just(1.0), wild),
    min_size=1,
    max_size=6,
)


@settings(deadline=None)
@given(table, moves)
def test_over_any_table_every_shape_agrees_with_dense_sampling_to_one_in_ten_thousand(
    make_abilities, make_tracks, table, moves
):
    abilities = make_abilities((np.concatenate([[0.0], np.cumsum(table[0])]), table[1], table[2]))
    tracks = make_tracks(moves)
    for fiber, curve, least in zip(fiber_of(tracks), tracks.curve, least_durations(tracks, abilities), strict=True):
        dense = _sampled(abilities, fiber, curve)
        assert least == pytest.approx(dense, rel=1e-4, abs=1e-12)


@settings(deadline=None)
@given(moves, rate, rate)
def test_the_closed_forms_agree_with_the_routine_for_tables(make_abilities, make_tracks, moves, fill, exhaust):
    abilities = make_abilities(([0.0, 0.1, 0.2, 0.3, 0.4], [fill] * 5, [exhaust] * 5))
    tracks = make_tracks(moves)
    general = durations_over_tables(abilities, fiber_of(tracks), tracks.curve)
    assert least_durations(tracks, abilities) == pytest.approx(general, rel=1e-4, abs=1e-12)


@settings(deadline=None)
@given(table, moves)
def test_a_ceiling_is_never_below_what_it_stands_for(make_abilities, make_tracks, table, moves):
    abilities = make_abilities((np.concatenate([[0.0], np.cumsum(table[0])]), table[1], table[2]))
    tracks = make_tracks(moves)
    assert np.all(duration_ceilings(tracks, abilities) >= least_durations(tracks, abilities) * (1 - 1e-9) - 1e-15)


@settings(deadline=None, max_examples=25)
@given(table, moves, st.floats(0.2, 8.0), st.floats(1e-4, 0.05))
def test_nor_is_one_of_moves_that_quiver(make_abilities, make_tracks, table, moves, hertz, amplitude):
    abilities = make_abilities((np.concatenate([[0.0], np.cumsum(table[0])]), table[1], table[2]))
    tracks = make_tracks(moves)
    last = len(tracks.time_s) - 1
    under = np.arange(len(tracks.time_s)) < last
    quivers = Quivers(*(np.array([one]) for one in (0, last, hertz, amplitude)))
    tracks = replace(tracks, manner=np.where(under, MOVE, tracks.manner).astype(np.int8), quivers=quivers)
    assert np.all(duration_ceilings(tracks, abilities) >= least_durations(tracks, abilities) * (1 - 1e-9) - 1e-15)


@given(moves, rate, rate)
def test_the_ceiling_is_the_least_duration_where_rates_are_constant(make_abilities, make_tracks, moves, fill, exhaust):
    abilities = make_abilities(([0.0, 0.4], [fill] * 2, [exhaust] * 2))
    tracks = make_tracks(moves)
    assert np.array_equal(duration_ceilings(tracks, abilities), least_durations(tracks, abilities))


@given(target, target, st.sampled_from(["smooth", "linear", "swell", "settle"]))
def test_a_named_shape_and_its_bare_polynomial_have_the_same_speeds(make_tracks, start, end, shape):
    tracks = make_tracks([(1.0, start, "linear"), (1.0, end, shape)])
    named = speed_range(tracks.curve[1:2], np.array([NAMES.index(shape)], dtype=np.int8))
    bare = speed_range(tracks.curve[1:2], np.array([-1], dtype=np.int8))
    assert np.array(named) == pytest.approx(np.array(bare), rel=1e-9, abs=1e-12)
