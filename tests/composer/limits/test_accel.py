"""The limit of acceleration."""

import pytest

from composer.limits.abilities import abilities_of
from composer.limits.accel import least_s, snags


def _find(tracks, rig):
    return snags(tracks, rig, abilities_of(rig))


def test_a_smooth_move_breaks_the_limit_in_leaving_and_in_arriving(make_rig, make_tracks, outside):
    peak = outside["minimum_jerk"]["peak_acceleration"]
    leaving, arriving = _find(make_tracks([(0.5, 0.2, "smooth")]), make_rig(1, accel=4.0))
    assert leaving.needs == pytest.approx(peak * 0.2 / 0.25)
    assert (leaving.has, leaving.unit) == (4.0, "1/s²")
    assert 0.0 < leaving.from_s < leaving.to_s < 0.25 < arriving.from_s < arriving.to_s < 0.5
    assert leaving.from_s == pytest.approx(0.5 - arriving.to_s)


def test_a_move_of_its_least_duration_is_in_order(make_rig, make_tracks):
    rig = make_rig(1, accel=4.0)
    (least, _) = least_s(make_tracks([(0.5, 0.2, "smooth")]), abilities_of(rig))
    assert _find(make_tracks([(least, 0.2, "smooth")]), rig) == []
    assert len(_find(make_tracks([(0.99 * least, 0.2, "smooth")]), rig)) == 2


def test_swell_accelerates_throughout_and_linear_never(make_rig, make_tracks):
    (snag,) = _find(make_tracks([(0.2, 0.1, "swell"), (0.2, 0.2, "linear")]), make_rig(1, accel=4.0))
    assert (snag.from_s, snag.to_s, snag.needs) == pytest.approx((0.0, 0.2, 5.0))


def test_without_a_limit_nothing_is_too_abrupt(make_rig, make_tracks):
    assert _find(make_tracks([(0.001, 0.2, "smooth")]), make_rig(1)) == []
