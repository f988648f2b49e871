"""The limit of switching."""

import pytest

from composer.limits.abilities import abilities_of
from composer.limits.switching import snags


def _find(tracks, rig):
    return snags(tracks, rig, abilities_of(rig))


def test_two_starts_closer_than_the_valve_can_switch_are_a_snag(make_rig, make_tracks):
    tracks = make_tracks([(0.05, 0.01, "linear"), (0.03, 0.01, "hold"), (0.05, 0.02, "linear")])
    (snag,) = _find(tracks, make_rig(1, max_switch_Hz=10.0))
    assert (snag.from_s, snag.to_s, snag.needs, snag.has) == pytest.approx((0.0, 0.08, 12.5, 10.0))
    assert (snag.unit, snag.knot, snag.mends) == ("Hz", 2, True)


def test_starts_as_far_apart_as_the_valve_wants_are_in_order(make_rig, make_tracks):
    tracks = make_tracks([(0.05, 0.01, "linear"), (0.05, 0.01, "hold"), (0.05, 0.02, "linear")])
    assert _find(tracks, make_rig(1, max_switch_Hz=10.0)) == []


def test_moves_that_follow_one_another_switch_once(make_rig, make_tracks):
    tracks = make_tracks([(0.01, 0.001, "linear"), (0.01, 0.0, "linear")] * 20)
    assert _find(tracks, make_rig(1, max_switch_Hz=10.0)) == []


def test_a_coil_that_is_on_while_holding_is_not_switched_by_a_hold(make_rig, make_tracks):
    tracks = make_tracks([(0.05, 0.01, "linear"), (0.03, 0.01, "hold"), (0.05, 0.02, "linear")])
    assert _find(tracks, make_rig(1, max_switch_Hz=10.0, energised_while_holding=True)) == []


def test_quick_starts_in_a_row_are_one_snag_told_by_the_quickest(make_rig, make_tracks):
    once = [(0.02, 0.01, "linear"), (0.03, 0.01, "hold"), (0.02, 0.0, "linear"), (0.04, 0.0, "hold")]
    (snag,) = _find(make_tracks(once * 3), make_rig(1, max_switch_Hz=10.0))
    assert (snag.from_s, snag.to_s, snag.needs) == pytest.approx((0.0, 0.27, 20.0))


def test_fibers_do_not_switch_each_others_valves(make_rig, make_tracks):
    assert _find(make_tracks([(0.05, 0.01, "linear")], [(0.05, 0.01, "linear")]), make_rig(2, max_switch_Hz=1.0)) == []
