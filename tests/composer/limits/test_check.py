"""The check of a score."""

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.limits.snag import KINDS
from composer.limits.table import LIMITS


def test_every_kind_of_snag_but_the_retimers_pins_has_its_row(make_rig):
    assert {limit.kind for limit in LIMITS} == set(KINDS) - {"pin"}


def test_a_score_that_the_rig_can_do_has_no_snag(make_rig, make_tracks):
    rig = make_rig(1)
    found = check(make_tracks([(2.0, 0.3, "smooth"), (1.0, 0.3, "hold"), (2.0, 0.0, "smooth")]), rig, abilities_of(rig))
    assert found.ok
    assert (found.duty_highest, found.duty_fiber) == (0.8, 0)


def test_snags_come_in_order_of_time_whatever_their_kind(make_rig, make_tracks):
    rig = make_rig(2, stroke=0.3, max_hold_s=2.0, accel=20.0)
    tracks = make_tracks(
        [(1.0, 0.0, "hold"), (0.1, 0.3, "smooth"), (5.0, 0.3, "hold"), (2.0, 0.4, "linear")], [(0.1, 0.3, "linear")]
    )
    found = check(tracks, rig, abilities_of(rig)).snags
    assert [s.from_s for s in found] == sorted(s.from_s for s in found)
    assert {s.kind for s in found} == {"rate", "accel", "hold", "stroke"}


def test_a_rig_is_checked_alike_twice(make_rig, make_tracks):
    rig = make_rig(1)
    tracks = make_tracks([(0.1, 0.3, "smooth"), (0.1, 0.0, "sudden")])
    assert check(tracks, rig, abilities_of(rig)) == check(tracks, rig, abilities_of(rig))
