"""The limit of stroke."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.stroke import snags


def _find(tracks, rig):
    return snags(tracks, rig, abilities_of(rig))


def test_above_the_stroke_is_a_snag_from_where_it_is_passed_to_where_it_is_left(make_rig, make_tracks):
    tracks = make_tracks([(1.0, 0.4, "linear"), (2.0, 0.4, "hold"), (1.0, 0.2, "linear")])
    (snag,) = _find(tracks, make_rig(1, stroke=0.3))
    assert (snag.from_s, snag.to_s) == pytest.approx((0.75, 3.5), abs=1e-6)
    assert (snag.needs, snag.has, snag.unit, snag.mends) == (pytest.approx(0.4), 0.3, "1", False)


def test_below_rest_is_a_snag_too(make_rig, make_tracks):
    (snag,) = _find(make_tracks([(2.0, [0.1, -0.2, 0.0, 0.0, 0.0, 0.0])]), make_rig(1))
    assert (snag.from_s, snag.to_s, snag.needs, snag.has) == pytest.approx((1.0, 2.0, -0.1, 0.0), abs=1e-6)


def test_full_stroke_and_rest_themselves_are_in_order(make_rig, make_tracks):
    tracks = make_tracks([(1.0, 0.3 + 5e-10, "smooth"), (1.0, 0.3, "hold"), (1.0, 0.0, "sudden")], duration_s=9.0)
    assert _find(tracks, make_rig(1, stroke=0.3)) == []


def test_a_score_that_ends_above_the_stroke_is_a_snag_up_to_its_end(make_rig, make_tracks):
    (snag,) = _find(make_tracks([(1.0, 0.4, "linear")], duration_s=5.0), make_rig(1, stroke=0.3))
    assert snag.to_s == 5.0


@settings(deadline=None)
@given(st.lists(st.floats(-0.3, 0.3).map(lambda x: round(x, 4)), min_size=6, max_size=6))
def test_the_stretches_are_where_dense_samples_lie_outside(make_rig, make_tracks, curve):
    rig = make_rig(1, stroke=0.2)
    found = _find(make_tracks([(1.0, curve)]), rig)
    u = np.linspace(0.0, 1.0, 1001)
    strain = np.polyval(curve[::-1], u)
    inside = np.zeros(len(u), dtype=bool)
    for snag in found:
        inside |= (u >= snag.from_s) & (u <= snag.to_s)
    clear = (np.abs(strain) > 1e-6) & (np.abs(strain - 0.2) > 1e-6)
    assert np.array_equal(inside[clear], ((strain > 0.2) | (strain < 0.0))[clear])
