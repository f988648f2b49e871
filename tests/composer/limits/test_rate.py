"""The limit of rate."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from composer.limits import rate as module
from composer.limits.abilities import abilities_of
from composer.limits.duration import least_durations
from composer.limits.rate import least_s, snags
from composer.limits.tables import rates, travel_time_s
from composer.quivers import Quivers


def _find(tracks, rig):
    return snags(tracks, rig, abilities_of(rig))


def test_a_linear_move_at_twice_the_fill_rate_is_a_snag_for_the_whole_of_it(make_rig, make_tracks):
    (snag,) = _find(make_tracks([(0.25, 0.3, "linear")]), make_rig(1, fill=0.6))
    assert (snag.from_s, snag.to_s, snag.needs, snag.has) == pytest.approx((0.0, 0.25, 1.2, 0.6))
    assert (snag.unit, snag.fiber, snag.knot, snag.line, snag.mends) == ("1/s", 0, 0, 10, True)


def test_a_linear_move_at_twice_the_fill_rate_takes_twice_as_long(make_rig, make_tracks):
    rig = make_rig(1, fill=0.6)
    least = least_s(make_tracks([(0.25, 0.3, "linear")]), abilities_of(rig))
    assert least[0] == pytest.approx(0.5, rel=1e-14)
    assert _find(make_tracks([(least[0], 0.3, "linear")]), rig) == []


def test_a_smooth_move_breaks_the_limit_in_its_middle_only(make_rig, make_tracks):
    (snag,) = _find(make_tracks([(0.8, 0.3, "smooth")]), make_rig(1, fill=0.6))
    speed = np.poly1d([30.0, -60.0, 30.0, 0.0, 0.0]) * 0.3 / 0.8
    assert 0.0 < snag.from_s < 0.4 < snag.to_s < 0.8
    assert speed(np.array([snag.from_s, snag.to_s]) / 0.8) == pytest.approx([0.6, 0.6], rel=1e-5)
    assert snag.needs == pytest.approx(15 / 8 * 0.3 / 0.8)


def test_each_direction_has_its_own_limit(make_rig, make_tracks):
    tracks = make_tracks([(0.6, 0.3, "linear"), (0.6, 0.0, "linear")])
    (snag,) = _find(tracks, make_rig(1, fill=0.6, exhaust=0.3))
    assert (snag.from_s, snag.needs, snag.has) == pytest.approx((0.6, 0.5, 0.3))


def test_a_millionth_too_fast_is_rounding(make_rig, make_tracks):
    assert _find(make_tracks([(0.5 * (1 - 9e-7), 0.3, "linear")]), make_rig(1, fill=0.6)) == []
    assert len(_find(make_tracks([(0.5 * (1 - 2e-6), 0.3, "linear")]), make_rig(1, fill=0.6))) == 1


def test_a_jump_is_a_snag_that_time_does_not_mend(make_rig, make_tracks):
    (snag,) = _find(make_tracks([(1.0, 0.0, "hold"), (0.0, 0.2, "step"), (1.0, 0.2, "hold")]), make_rig(1, fill=0.6))
    assert (snag.from_s, snag.to_s, snag.needs, snag.has, snag.mends) == (1.0, 1.0, pytest.approx(0.2 / 0.005), 0.6, False)


def test_a_jump_below_the_drives_resolution_is_in_order(make_rig, make_tracks):
    assert _find(make_tracks([(0.0, 0.3 / 65536, "step"), (1.0, 0.3 / 65536, "hold")]), make_rig(1, stroke=0.3)) == []


def test_a_move_of_no_length_is_a_snag_that_time_mends(make_rig, make_tracks):
    (snag,) = _find(make_tracks([(0.0, 0.2, "linear"), (1.0, 0.2, "hold")]), make_rig(1))
    assert snag.mends
    assert np.isfinite(snag.needs)


def test_sudden_with_the_time_it_takes_is_in_order_and_with_less_a_snag(make_abilities, make_tracks, make_rig):
    abilities = make_abilities(([0.0, 0.1, 0.3], [1.0, 0.4, 0.2], [0.1, 0.5, 0.6]))
    (takes,) = travel_time_s(abilities, [0], [0.0], [0.3])
    assert snags(make_tracks([(takes, 0.3, "sudden")]), make_rig(1), abilities) == []
    (snag,) = snags(make_tracks([(0.5 * takes, 0.3, "sudden")]), make_rig(1), abilities)
    assert (snag.from_s, snag.to_s, snag.needs / snag.has) == pytest.approx((0.0, 0.5 * takes, 2.0))


def test_over_a_table_a_move_breaks_the_limit_where_the_table_is_low(make_abilities, make_tracks, make_rig):
    abilities = make_abilities(([0.0, 0.1, 0.15, 0.2, 0.3], [1.0, 1.0, 0.1, 1.0, 1.0], [1.0] * 5))
    (snag,) = snags(make_tracks([(1.0, 0.3, "linear")]), make_rig(1), abilities)
    # 0.3/s is above the table between the strains at which that falls and rises through 0.3.
    low, high = 0.1 + 0.05 * 0.7 / 0.9, 0.2 - 0.05 * 0.7 / 0.9
    assert (snag.from_s, snag.to_s) == pytest.approx((low / 0.3, high / 0.3), abs=1e-6)
    assert (snag.needs, snag.has) == pytest.approx((0.3, 0.1))


rate = st.floats(0.05, 2.0)
wild = st.lists(st.floats(-0.5, 0.5).map(lambda x: round(x, 4)), min_size=6, max_size=6)


@settings(deadline=None, max_examples=60)
@example([-0.2812, 0.375, 0.0, 0.375, 0.125, 0.125], 2.0, [1.0, 0.4375, 2.0, 1.0, 1.0], [1.0] * 5, False)  # at a corner alone
@given(wild, st.floats(0.1, 3.0), st.lists(rate, min_size=5, max_size=5), st.lists(rate, min_size=5, max_size=5), st.booleans())
def test_the_stretches_are_where_dense_samples_are_too_fast(
    make_abilities, make_tracks, make_rig, curve, lasts, up, down, even
):
    if even:
        up, down = [up[0]] * 5, [down[0]] * 5
    abilities = make_abilities(([0.0, 0.05, 0.1, 0.2, 0.3], up, down))
    found = snags(make_tracks([(lasts, curve)]), make_rig(1), abilities)
    u = np.linspace(0.0, 1.0, 997)
    strain, speed = np.polyval(curve[::-1], u), np.polyval(np.polyder(curve[::-1]), u) / lasts
    ratio = np.abs(speed) / rates(abilities, np.zeros(len(u), dtype=int), strain, speed > 0.0)
    told = np.zeros(len(u), dtype=bool)
    for snag in found:
        told |= (u * lasts >= snag.from_s) & (u * lasts <= snag.to_s)
    # A limit is passed for less than two samples only where the sampler of the module itself may miss it.
    sure = np.abs(ratio - 1.0) > 0.02
    assert np.array_equal(told[sure], ratio[sure] > 1.0)
    assert bool(found) == (least_durations(make_tracks([(lasts, curve)]), abilities)[0] > lasts * (1 + 1e-6))
    if found:
        assert max(s.needs / s.has for s in found) >= ratio.max() * (1 - 1e-4)


@pytest.mark.parametrize("hertz", [0.0, 4.0])
def test_what_a_score_repeats_a_hundred_times_is_closed_in_on_once_and_told_a_hundred_times(
    make_abilities, make_tracks, make_rig, hertz, monkeypatch
):
    abilities = make_abilities(([0.0, 0.1, 0.15, 0.2, 0.3], [1.0, 1.0, 0.5, 1.0, 1.0], [1.0] * 5))
    tracks = make_tracks([(0.15, 0.25, "smooth"), (2.1, 0.0, "smooth"), (0.9, 0.0, "smooth")] * 100)
    if hertz:
        knots = 3 * np.arange(100)
        quivers = Quivers(knots, knots + 1, np.full(100, hertz), np.full(100, 0.005))
        tracks = replace(tracks, quivers=quivers)
    asked = []
    real = module.stretches_over
    monkeypatch.setattr(
        module, "stretches_over", lambda over, worst, *also: asked.append(len(worst)) or real(over, worst, *also)
    )
    found = snags(tracks, make_rig(1), abilities)
    assert max(asked) == 1
    assert len(found) == 100
    begins = tracks.time_s[[snag.knot for snag in found]]
    assert np.array([snag.from_s for snag in found]) - begins == pytest.approx(found[0].from_s)
    assert np.array([snag.to_s for snag in found]) - begins == pytest.approx(found[0].to_s)
