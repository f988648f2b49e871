"""Of all limits on, no snag is left; but for what no times can keep beside what else must happen, and that is told apart."""

from itertools import pairwise

import numpy as np
from hypothesis import example, given, settings
from hypothesis import strategies as st
from scipy.optimize import linprog

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.retime.cuts import duty_rows
from composer.retime.retiming import retime
from composer.retime.rows import joined
from composer.retime.stage import stage_of
from composer.retime.switches import kept_apart, switch_rows
from composer.tracks import HOLD

from .scores import random_score, tracks_of

NONE = np.empty(0)


def do(rig, tracks, pins=(), keep="clock", **more):
    return retime(tracks, abilities_of(rig), rig, np.asarray(pins, dtype=float), keep, **more)


def kept_by_some_times(tracks, rig, abilities):
    """Whether some times keep all that a programme asks from the start, by another solver."""
    stage = stage_of(tracks, abilities, NONE, NONE, None, False)
    now = stage.tracks
    moves = [np.flatnonzero(now.manner[a:b] != HOLD) + a for a, b in pairwise(now.first.tolist())]
    spans = [(int(i), int(j)) for mine in moves for i in mine for j in mine[mine >= i]]
    apart = switch_rows(kept_apart(now, stage.least_s, rig, abilities), now, stage.events, rig)
    rows = joined([stage.rows, duty_rows(spans, now, stage.events, rig, abilities), apart])
    none = np.zeros(rows.matrix.shape[1])
    return linprog(none, A_ub=-rows.matrix, b_ub=-rows.least, bounds=(None, None)).status == 0


@settings(max_examples=20, deadline=None)
@example(5391, "clock")
@given(st.integers(0, 10_000), st.sampled_from(("clock", "rhythm")))
def test_no_snag_is_left(make_rig, seed, keep):
    rig = make_rig(4, accel=(None, 3.0)[seed % 2], max_hold_s=(0.0, 4.0)[seed // 2 % 2], duty=0.6, duty_burst_s=3.0,
                   max_switch_Hz=(50.0, 0.8)[seed // 4 % 2])  # fmt: skip
    made = random_score(seed, pins=False)
    abilities = abilities_of(rig)
    found = do(rig, made.tracks, made.pins_s, keep, shrink=True)
    left = check(found.tracks, rig, abilities).snags
    # What must happen meanwhile may take too long at its fastest for a hold or a coil: the retiming says where.
    assert not any(found.mends(snag) for snag in left)
    # Two that touch are one snag, so they are not counted: each lies in one that is left.
    for lost in found.hopeless if left else ():
        assert any(
            (snag.kind, snag.fiber) == (lost.kind, lost.fiber) and snag.from_s <= lost.to_s and snag.to_s >= lost.from_s
            for snag in left
        )
    assert bool(found.hopeless) == (not kept_by_some_times(made.tracks, rig, abilities))


def test_a_hold_that_no_times_keep_beside_what_else_must_happen_is_told_apart(make_rig):
    # Between the hits of r.1, r.2 goes up and down in 1.483 s; half of that, as r.1 comes down, and 0.25 s up remain.
    up = [(0.0, 0.3, "linear"), (1.0, None, "hold"), (3.0, 0.0, "linear"), (4.0, None, "end")]
    busy = [(0.0, 0.01, "linear"), (1.0, 0.3, "linear"), (2.0, 0.0, "linear"), (3.0, None, "end")]
    for longest, hopeless in ((1.0, False), (0.98, True)):
        rig = make_rig(2, max_hold_s=longest)
        found = do(rig, tracks_of([up, busy]))
        left = check(found.tracks, rig, abilities_of(rig)).snags
        assert [(snag.kind, snag.fiber, found.mends(snag)) for snag in left] == ([("hold", 0, False)] if hopeless else [])


def test_seed_367_is_a_hold_that_no_times_keep_and_all_else_of_it_is_mended(make_rig):
    rig = make_rig(4, accel=3.0, max_hold_s=4.0, duty=0.6, duty_burst_s=3.0)
    made = random_score(367, pins=False)
    assert not kept_by_some_times(made.tracks, rig, abilities_of(rig))
    found = do(rig, made.tracks)
    (left,) = check(found.tracks, rig, abilities_of(rig)).snags
    assert (left.kind, found.mends(left)) == ("hold", False)
    assert [one.kind for one in found.hopeless] == ["hold"]


def test_beside_what_draws_too_much_at_once_nothing_is_moved_in_vain_for_the_air(make_rig):
    rig = make_rig(2, air_mL=30.0, receiver_L=0.015, compressor_L_min=0.06)
    tracks = tracks_of([[(0.0, None, "hold"), (1.5, 0.3, "sudden"), (2.0, None, "end")]] * 2, 5.0)
    abilities = abilities_of(rig)
    found = retime(tracks, abilities, rig, np.empty(0))
    (snag,) = check(found.tracks, rig, abilities).snags
    assert found.cost == 0.0
    assert (snag.kind, found.mends(snag)) == ("air", False)
