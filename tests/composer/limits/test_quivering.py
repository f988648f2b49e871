"""Quivers against every limit, held against tracks sampled so densely that nothing of their kind need be known."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from composer.limits import accel, hold, rate, stroke, switching
from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.limits.duration import least_durations
from composer.limits.fills import fills_of
from composer.limits.quivering import shaken
from composer.limits.tables import rates
from composer.motion import rate_at, strain_at
from composer.quivers import Quivers
from composer.tracks import HOLD, MOVE

TABLE = ([0.0, 0.1, 0.2, 0.3], [0.9, 0.6, 0.5, 0.2], [0.1, 0.4, 0.7, 0.8])


def quivering(tracks, *quivers):
    """Tracks of one fiber with quivers of (knot, until, Hz, strain) on top; what holds beneath one is a still move."""
    columns = [np.array(column) for column in zip(*quivers, strict=True)]
    manner = tracks.manner.copy()
    for knot, until, _, _ in quivers:
        manner[knot:until][manner[knot:until] == HOLD] = MOVE
    return replace(tracks, manner=manner, quivers=Quivers(*columns))


def still(make_tracks, *, at=0.15, lasts=4.0, hertz=2.0, amplitude=0.01):
    """A fiber that goes slowly to a strain and quivers there."""
    return quivering(make_tracks([(20.0, at, "smooth"), (lasts, None, "hold")]), (1, 2, hertz, amplitude))


@pytest.mark.parametrize("rising", [True, False])
def test_a_quiver_may_be_as_fast_as_the_slower_of_the_two_ways(make_tracks, make_rig, rising):
    rig = make_rig(1, fill=0.4 if rising else 2.0, exhaust=2.0 if rising else 0.4)
    abilities = abilities_of(rig)
    edge = 0.4 / (4.0 * np.pi)
    assert rate.snags(still(make_tracks, amplitude=edge * (1.0 + 5e-7)), rig, abilities) == []
    (snag,) = rate.snags(still(make_tracks, amplitude=edge * 1.5), rig, abilities)
    assert (snag.mends, snag.from_s, snag.to_s, snag.knot) == (False, 20.0, 24.0, 1)
    assert (snag.needs, snag.has) == pytest.approx((0.6, 0.4))


def test_a_move_beneath_a_quiver_needs_the_time_that_the_rest_of_the_rate_takes(make_tracks, make_rig):
    abilities = abilities_of(make_rig(1, fill=0.6, exhaust=0.5))
    tracks = quivering(make_tracks([(1.0, 0.2, "smooth"), (1.0, 0.1, "linear")]), (0, 2, 2.0, 0.01))
    took = 0.04 * np.pi
    expected = [0.2 * 15 / 8 / (0.6 - took), 0.1 / (0.5 - took)]
    np.testing.assert_allclose(least_durations(tracks, abilities)[:2], expected, rtol=1e-8)
    np.testing.assert_allclose(rate.least_s(tracks, abilities)[:2], expected, rtol=1e-8)


def test_of_several_quivers_the_rates_add_up(make_tracks, make_rig):
    abilities = abilities_of(make_rig(1, fill=0.6, exhaust=0.5))
    tracks = quivering(make_tracks([(1.0, 0.2, "linear")]), (0, 1, 2.0, 0.01), (0, 1, 3.0, 0.005))
    expected = 0.2 / (0.6 - 2.0 * np.pi * (0.02 + 0.015))
    np.testing.assert_allclose(least_durations(tracks, abilities)[0], expected, rtol=1e-8)


@settings(max_examples=60, deadline=None)
@given(st.data())
def test_what_lasts_its_least_time_is_never_faster_than_its_fiber_at_any_strain(make_tracks, make_abilities, data):
    abilities = make_abilities(TABLE)
    shape = data.draw(st.sampled_from(["smooth", "linear", "swell", "settle"]))
    ends = data.draw(st.tuples(st.floats(0.05, 0.25), st.floats(0.05, 0.25)))
    frequency, amplitude = data.draw(st.floats(0.2, 8.0)), data.draw(st.floats(1e-4, 0.05))
    tracks = quivering(make_tracks([(30.0, ends[0], "smooth"), (1.0, ends[1], shape)]), (1, 2, frequency, amplitude))
    least = least_durations(tracks, abilities)[1]
    sure = np.isfinite(least)
    lasts = least if sure and least > 0.0 else 3.0
    tracks = replace(tracks, time_s=np.array([0.0, 30.0, 30.0 + lasts]), duration_s=30.0 + lasts)
    time = 30.0 + np.linspace(0.0, lasts, 60001)[1:-1]
    strain, speed = strain_at(tracks, abilities, time)[0], rate_at(tracks, abilities, time)[0]
    share = np.abs(speed) / rates(abilities, np.zeros(len(time), int), strain, speed > 0.0)
    if sure and least > 0.0:
        assert share.max() <= 1.0 + 2e-4
    if share.max() > 1.0 + 2e-4:
        assert rate.snags(tracks, None, abilities)


@settings(max_examples=60, deadline=None)
@given(st.floats(0.08, 0.22), st.floats(0.2, 8.0), st.floats(1e-3, 0.05))
def test_what_is_told_to_be_too_fast_on_a_hold_is_so_at_some_phase_by_no_less_than_is_told(
    make_tracks, make_abilities, at, frequency, amplitude
):
    abilities = make_abilities(TABLE)
    worst, found = 0.0, rate.snags(still(make_tracks, at=at, hertz=frequency, amplitude=amplitude), None, abilities)
    # The phase at which it ends is all that a hold leaves open.
    for part in np.linspace(0.0, 1.0, 97):
        tracks = still(make_tracks, at=at, hertz=frequency, amplitude=amplitude, lasts=(3.0 + part) / frequency)
        time = 20.0 + np.linspace(0.0, (3.0 + part) / frequency, 3001)[1:-1]
        strain, speed = strain_at(tracks, abilities, time)[0], rate_at(tracks, abilities, time)[0]
        worst = max(worst, float((np.abs(speed) / rates(abilities, np.zeros(len(time), int), strain, speed > 0.0)).max()))
    if found:
        assert found[0].needs / found[0].has == pytest.approx(worst, rel=2e-3)
    else:
        assert worst <= 1.0 + 2e-4


@settings(max_examples=40, deadline=None)
@given(st.floats(0.08, 0.22), st.floats(0.2, 8.0), st.floats(5e-3, 0.05), st.booleans())
def test_shrunk_or_slowed_by_what_the_snag_says_a_quiver_can_be_done(
    make_tracks, make_abilities, at, frequency, amplitude, shrink
):
    abilities = make_abilities(TABLE)
    snags = rate.snags(still(make_tracks, at=at, hertz=frequency, amplitude=amplitude), None, abilities)
    if snags:
        factor = snags[0].has / snags[0].needs
        frequency, amplitude = (frequency, amplitude * factor) if shrink else (frequency * factor, amplitude)
        assert rate.snags(still(make_tracks, at=at, hertz=frequency, amplitude=amplitude), None, abilities) == []


def test_time_mends_a_move_too_fast_for_its_quiver_and_not_a_quiver_too_fast(make_tracks, make_rig):
    rig = make_rig(1, fill=0.6, exhaust=0.6)
    abilities = abilities_of(rig)
    tracks = quivering(make_tracks([(0.4, 0.2, "linear")]), (0, 1, 5.0, 0.01))
    (snag,) = rate.snags(tracks, rig, abilities)
    assert snag.mends
    assert (snag.needs, snag.has) == pytest.approx((0.5, 0.6 - 0.1 * np.pi))
    assert least_durations(tracks, abilities)[0] == pytest.approx(0.2 / (0.6 - 0.1 * np.pi))


def test_a_quiver_takes_twice_its_sines_acceleration(make_tracks, make_rig):
    edge = 2.0 * (4.0 * np.pi) ** 2 * 0.01
    tracks = still(make_tracks)
    for limit, count in ((edge * 1.001, 0), (edge * 0.999, 1)):
        rig = make_rig(1, accel=limit)
        found = accel.snags(tracks, rig, abilities_of(rig))
        assert len(found) == count
    assert (found[0].mends, found[0].from_s, found[0].to_s) == (False, 20.0, 24.0)
    assert found[0].needs == pytest.approx(edge)


def test_a_move_has_the_acceleration_that_its_quiver_leaves(make_tracks, make_rig):
    abilities = abilities_of(make_rig(1, fill=99.0, exhaust=99.0, accel=5.0))
    tracks = quivering(make_tracks([(1.0, 0.2, "swell")]), (0, 1, 2.0, 0.01))
    expected = np.sqrt(0.4 / (5.0 - 2.0 * (4.0 * np.pi) ** 2 * 0.01))
    np.testing.assert_allclose(accel.least_s(tracks, abilities)[0], expected, rtol=1e-5)


def test_a_quiver_dips_below_rest_by_what_is_told_and_in_one_snag(make_tracks, make_rig):
    rig = make_rig(1)
    (snag,) = stroke.snags(still(make_tracks, at=0.006, lasts=4.0), rig, abilities_of(rig))
    assert (snag.mends, snag.needs, snag.has) == (False, pytest.approx(-0.004), 0.0)
    down = np.arcsin(0.6) / (4.0 * np.pi)
    assert (snag.from_s, snag.to_s) == (pytest.approx(20.25 + down), pytest.approx(24.0 - down, abs=0.1))


def test_a_quiver_at_the_end_of_the_stroke_goes_above_it_and_one_that_keeps_below_does_not(make_tracks, make_rig):
    rig = make_rig(1, stroke=0.3)
    (snag,) = stroke.snags(still(make_tracks, at=0.295), rig, abilities_of(rig))
    assert snag.needs == pytest.approx(0.305)
    assert stroke.snags(still(make_tracks, at=0.29), rig, abilities_of(rig)) == []


@settings(max_examples=40, deadline=None)
@example(0.25, 0.0, 1.75, 0.001, 0.3046875)  # dips below rest between the last two samples
@example(0.123046875, 0.0, 2.80016, 0.0420146, 1.35393)  # another swing than that of the lowest sample goes lowest
@given(st.floats(0.0, 0.3), st.floats(0.0, 0.3), st.floats(0.3, 6.0), st.floats(1e-3, 0.05), st.floats(0.3, 3.0))
def test_the_worst_strain_is_what_a_dense_grid_meets(make_tracks, make_rig, a, b, frequency, amplitude, lasts):
    rig = make_rig(1, stroke=0.3)
    abilities = abilities_of(rig)
    tracks = quivering(make_tracks([(20.0, a, "smooth"), (lasts, b, "smooth")]), (1, 2, frequency, amplitude))
    strain = strain_at(tracks, abilities, 20.0 + np.linspace(0.0, lasts, 40001))[0]
    told = {snag.has: snag.needs for snag in stroke.snags(tracks, rig, abilities)}
    for edge, worst, past in ((0.3, strain.max(), strain.max() - 0.3), (0.0, strain.min(), -strain.min())):
        if past > 1e-6:
            assert told[edge] == pytest.approx(worst, abs=1e-7)
        elif past < 0.0:
            assert edge not in told or abs(told[edge] - worst) < 1e-7


def test_a_quiver_has_its_valve_change_over_twice_a_period(make_tracks, make_rig):
    rig = make_rig(1, max_switch_Hz=4.0)
    assert switching.snags(still(make_tracks, hertz=2.0), rig, abilities_of(rig)) == []
    (snag,) = switching.snags(still(make_tracks, hertz=2.5), rig, abilities_of(rig))
    assert (snag.needs, snag.has, snag.mends, snag.from_s, snag.to_s) == (5.0, 4.0, False, 20.0, 24.0)


def test_a_quiver_that_dips_below_half_stroke_breaks_a_long_hold(make_tracks, make_rig):
    rig = make_rig(1, stroke=0.3, max_hold_s=3.0)
    abilities = abilities_of(rig)
    above = make_tracks([(1.0, 0.17, "linear"), (4.0, None, "hold"), (1.0, 0.0, "linear")])
    assert [snag.has for snag in hold.snags(quivering(above, (1, 2, 2.0, 0.019)), rig, abilities)] == [3.0]
    assert hold.snags(quivering(above, (1, 2, 2.0, 0.021)), rig, abilities) == []
    assert hold.runs_above_half(quivering(above, (1, 2, 2.0, 0.021)), abilities).run[-1] == 8


def test_every_upstroke_draws(make_tracks, make_rig):
    rig = make_rig(1, stroke=0.3, air_mL=300.0)
    abilities = abilities_of(rig)
    tracks = still(make_tracks, lasts=4.0, hertz=2.0, amplitude=0.01)
    fills = fills_of(tracks, abilities)
    assert np.count_nonzero(fills.segment == 1) == 9
    strain = strain_at(tracks, abilities, np.linspace(0.0, 24.0, 240_001))[0]
    assert fills.litres.sum() == pytest.approx(np.maximum(np.diff(strain), 0.0).sum(), rel=1e-6)


def test_a_coil_is_on_while_its_fiber_quivers(make_tracks, make_rig):
    rig = make_rig(1, duty=0.9, duty_burst_s=1.0)
    found = check(still(make_tracks), rig, abilities_of(rig))
    assert found.duty_highest == pytest.approx(1.0)


def test_nothing_quivers_where_nothing_is_written(make_tracks):
    assert shaken(make_tracks([(1.0, 0.2, "smooth")])) is None
