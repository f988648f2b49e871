"""Starts of a coil that follow too soon: what keeps them apart, what needs nothing, and what no time mends."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.quivers import Quivers
from composer.retime.proof import causes
from composer.retime.retiming import retime
from composer.retime.rows import SWITCH_ROW
from composer.retime.stage import stage_of
from composer.retime.switches import kept_apart, switch_rows

from .scores import random_score, tracks_of

NONE = np.empty(0)
TWICE = [(0.0, 0.03, "linear"), (0.2, None, "hold"), (0.3, 0.06, "linear"), (2.0, None, "end")]
"""Two small moves, the second of which starts 0.3 s after the first."""


def kinds(tracks, rig):
    return {snag.kind for snag in check(tracks, rig, abilities_of(rig)).snags}


def test_a_start_that_follows_too_soon_is_put_off_and_no_hit_moves(make_rig):
    rig = make_rig(1, max_switch_Hz=2.0)
    tracks = tracks_of([TWICE])
    assert kinds(tracks, rig) == {"switching"}
    found = retime(tracks, abilities_of(rig), rig, NONE)
    assert found.tracks.time_s.tolist() == pytest.approx([0.0, 0.2, 0.5, 2.0])
    assert found.cost == pytest.approx(0.2 * 0.1 / 20.0)
    assert found.bound == pytest.approx(found.cost)
    assert not kinds(found.tracks, rig)


def test_a_hit_that_a_valve_keeps_late_says_so(make_rig):
    rig = make_rig(1, max_switch_Hz=2.0)
    short = [(0.0, 0.03, "linear"), (0.2, None, "hold"), (0.3, 0.06, "linear"), (0.4, None, "end")]
    found = retime(tracks_of([short]), abilities_of(rig), rig, NONE)
    assert found.tracks.time_s.tolist() == pytest.approx([0.0, 0.2, 0.5, 0.55])
    (cause,) = causes(found.proof)
    assert (cause.kind, cause.fiber) == ("switching", 0)


def test_a_rest_that_is_used_up_keeps_its_starts_apart(make_rig):
    # The first move needs 0.4 s of the 0.5 s that there are before the second may start.
    rig = make_rig(1, max_switch_Hz=2.0)
    track = [(0.0, 0.24, "linear"), (0.1, None, "hold"), (0.15, 0.3, "linear"), (0.5, None, "end")]
    found = retime(tracks_of([track]), abilities_of(rig), rig, NONE)
    assert found.tracks.time_s[2] == pytest.approx(0.5)
    assert not kinds(found.tracks, rig)


def test_moves_that_take_longer_than_the_valve_need_no_row(make_rig):
    rig = make_rig(1, max_switch_Hz=2.0)
    tracks = tracks_of([[(0.0, 0.3, "linear"), (0.5, None, "hold"), (0.6, 0.0, "linear"), (2.0, None, "end")]])
    stage = stage_of(tracks, abilities_of(rig), NONE, NONE, None, False)
    assert kept_apart(stage.tracks, stage.least_s, rig, abilities_of(rig)) == []
    tracks = tracks_of([TWICE])
    stage = stage_of(tracks, abilities_of(rig), NONE, NONE, None, False)
    pairs = kept_apart(stage.tracks, stage.least_s, rig, abilities_of(rig))
    assert pairs == [(0, 2)]
    rows = switch_rows(pairs, stage.tracks, stage.events, rig)
    assert rows.kind.tolist() == [SWITCH_ROW]
    assert rows.least.tolist() == pytest.approx([0.2])


def test_a_coil_that_stays_on_while_holding_starts_once(make_rig):
    rig = make_rig(1, max_switch_Hz=2.0, energised_while_holding=True, duty=1.0)
    tracks = tracks_of([TWICE])
    found = retime(tracks, abilities_of(rig), rig, NONE)
    assert found.cost == 0.0
    assert not kinds(tracks, rig)


def waiting(make_rig, other, hertz=1.0):
    """A sudden move that would wait for a slow one it lands with, after a quick move within a second of its start."""
    rig = make_rig(2, max_switch_Hz=hertz)
    tracks = tracks_of([[(0.0, 0.03, "linear"), (0.3, 0.06, "sudden"), (0.35, None, "end")], other])
    assert kinds(tracks, rig) == {"rate"}
    found = retime(tracks, abilities_of(rig), rig, NONE)
    assert not kinds(found.tracks, rig)
    assert found.bound < found.cost
    return found.tracks.time_s[:4]


def test_a_sudden_move_that_would_wait_goes_on_from_the_move_before_where_that_costs_less(make_rig):
    # 0.5 s for the slow one: the quick one is let land at 0.45 s.
    times = waiting(make_rig, [(0.0, 0.3, "linear"), (0.35, None, "end")])
    assert times[:3].tolist() == pytest.approx([0.0, 0.45, 0.5])


def test_a_sudden_move_that_must_wait_starts_its_coil_once_more_and_late_enough(make_rig):
    # The hit at 0.3 s is a heavy one, so it stays, and the sudden move's valve is given its half second.
    held = [(0.0, 0.15, "linear"), (0.3, 0.3, "linear"), (0.31, None, "end")]
    times = waiting(make_rig, held, 1.9)
    assert times.tolist() == pytest.approx([0.0, 0.3, 1 / 1.9, 1 / 1.9 + 0.05])


def test_jumps_too_near_one_another_are_moved_apart_though_they_stay_jumps(make_rig):
    rig = make_rig(1, max_switch_Hz=2.0)
    track = [(0.0, None, "hold"), (1.0, 0.1, "step"), (1.0, None, "hold"), (1.2, 0.0, "step"), (1.2, None, "end")]
    tracks = tracks_of([track])
    assert kinds(tracks, rig) == {"rate", "switching"}
    found = retime(tracks, abilities_of(rig), rig, NONE)
    assert kinds(found.tracks, rig) == {"rate"}


def test_a_quiver_too_fast_for_its_valve_stays_a_snag_that_no_time_mends(make_rig):
    rig = make_rig(1, max_switch_Hz=2.0)
    track = [(0.0, 0.15, "linear"), (1.0, 0.15, "linear"), (3.0, 0.0, "linear"), (4.0, None, "end")]
    shaking = Quivers(np.array([1]), np.array([2]), np.array([5.0]), np.array([0.001]))
    tracks = replace(tracks_of([track]), quivers=shaking)
    found = retime(tracks, abilities_of(rig), rig, NONE)
    left = check(found.tracks, rig, abilities_of(rig)).snags
    assert [(snag.kind, snag.mends) for snag in left] == [("switching", False)]
    assert found.cost == 0.0


def test_starts_that_pins_leave_too_near_are_given_up_and_told(make_rig):
    rig = make_rig(1, max_switch_Hz=2.0)
    track = [(0.0, 0.03, "linear"), (0.2, None, "hold"), (0.3, 0.06, "linear"), (0.4, 0.3, "linear"), (2.0, None, "end")]
    found = retime(tracks_of([track]), abilities_of(rig), rig, np.array([0.4]))
    assert not found.pins_short
    (left,) = check(found.tracks, rig, abilities_of(rig)).snags
    assert (left.kind, left.mends) == ("switching", True)


@settings(max_examples=20, deadline=None)
@given(st.integers(0, 10_000), st.sampled_from(("clock", "rhythm")), st.sampled_from((0.5, 1.0, 2.0)))
def test_no_start_follows_too_soon_and_doing_it_again_changes_nothing(make_rig, seed, keep, hertz):
    rig = make_rig(4, max_switch_Hz=hertz)
    made = random_score(seed, pins=False)
    found = retime(made.tracks, abilities_of(rig), rig, NONE, keep)
    assert not kinds(found.tracks, rig)
    again = retime(found.tracks, abilities_of(rig), rig, NONE, keep)
    assert np.array_equal(again.tracks.time_s, found.tracks.time_s)
