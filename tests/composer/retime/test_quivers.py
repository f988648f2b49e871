"""Retiming of what quivers."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.quivers import Quivers
from composer.retime.events import strain_gone, with_waits
from composer.retime.retiming import retime
from composer.retime.shrink import scaled
from composer.tracks import HOLD, MOVE, SUDDEN, durations

from .scores import tracks_of


def quivering(tracks, *quivers):
    """Tracks with quivers (knot, until, Hz, strain) on top; what holds beneath one is a still move."""
    manner = tracks.manner.copy()
    for knot, until, _, _ in quivers:
        manner[knot:until][manner[knot:until] == HOLD] = MOVE
    return replace(tracks, manner=manner, quivers=Quivers(*(np.array(column) for column in zip(*quivers, strict=True))))


PHRASE = [(0.0, 0.2, "linear"), (1.0, None, "hold"), (2.0, 0.1, "linear"), (3.0, 0.0, "linear"), (6.0, None, "end")]


def test_a_move_beneath_a_quiver_gets_the_time_that_its_quiver_leaves_it_need_of(make_rig):
    rig = make_rig(1, fill=0.6, exhaust=0.3)
    tracks = quivering(tracks_of([PHRASE]), (2, 3, 4.0, 0.01))
    found = retime(tracks, abilities_of(rig), rig, np.empty(0))
    left = 0.3 - 2.0 * np.pi * 4.0 * 0.01
    assert durations(found.tracks)[2] == pytest.approx(0.1 / left)
    assert check(found.tracks, rig, abilities_of(rig)).ok


def test_a_quiver_keeps_frequency_and_amplitude_and_goes_with_its_stretch(make_rig):
    rig = make_rig(1, fill=0.6, exhaust=0.3)
    tracks = quivering(tracks_of([PHRASE]), (1, 3, 2.0, 0.01), (2, 3, 4.0, 0.002))
    new = retime(tracks, abilities_of(rig), rig, np.empty(0)).tracks
    assert (new.quivers.hertz.tolist(), new.quivers.amplitude.tolist()) == ([2.0, 4.0], [0.01, 0.002])
    assert (new.quivers.knot.tolist(), new.quivers.until.tolist()) == ([1, 2], [3, 3])


def test_a_score_that_the_rig_can_do_quivers_on_untouched(make_rig):
    rig = make_rig(1)
    tracks = quivering(tracks_of([PHRASE]), (1, 2, 2.0, 0.01))
    new = retime(tracks, abilities_of(rig), rig, np.empty(0)).tracks
    assert new.time_s.tolist() == tracks.time_s.tolist()


def test_a_quiver_too_fast_for_its_fiber_holds_nothing_else_up_and_is_left_as_it_is(make_rig):
    rig = make_rig(1)
    tracks = quivering(tracks_of([PHRASE]), (1, 2, 20.0, 0.05))
    new = retime(tracks, abilities_of(rig), rig, np.empty(0)).tracks
    assert new.time_s.tolist() == tracks.time_s.tolist()
    assert [(snag.kind, snag.mends) for snag in check(new, rig, abilities_of(rig)).snags] == [("rate", False)]


def test_a_quiver_weighs_what_it_goes_through_in_a_period(make_rig):
    tracks = quivering(tracks_of([PHRASE]), (1, 3, 2.0, 0.01))
    np.testing.assert_allclose(strain_gone(tracks), [0.2, 0.04, 0.14, 0.1, 0.0], atol=1e-12)


def test_waits_put_in_before_a_strike_leave_quivers_where_they_were():
    one = [(0.0, 0.2, "linear"), (1.0, None, "hold"), (2.0, 0.1, "sudden"), (3.0, 0.0, "linear"), (6.0, None, "end")]
    tracks = quivering(tracks_of([one, PHRASE]), (1, 2, 2.0, 0.01), (3, 4, 3.0, 0.01), (6, 7, 2.0, 0.01))
    prepared, _ = with_waits(tracks)
    assert prepared.manner[:5].tolist() == [MOVE, MOVE, HOLD, SUDDEN, MOVE]
    ends = [prepared.time_s[column] for column in (prepared.quivers.knot, prepared.quivers.until)]
    assert [column.tolist() for column in ends] == [[1.0, 3.0, 1.0], [2.0, 6.0, 2.0]]
    assert prepared.quivers.until[0] == 2
    assert prepared.manner[prepared.quivers.knot].tolist() == [MOVE, MOVE, MOVE]


def test_a_quiver_shrinks_with_the_moves_beneath_it_and_no_other(make_rig):
    tracks = quivering(tracks_of([PHRASE]), (1, 2, 2.0, 0.01), (2, 3, 2.0, 0.02))
    new = scaled(tracks, np.array([2]), 0.5)
    assert new.quivers.amplitude.tolist() == [0.01, 0.01]
    assert new.curve[2].sum() == pytest.approx(0.15)


def test_what_is_held_and_quivers_after_a_shrunk_move_stays_at_its_new_value(make_rig):
    tracks = quivering(tracks_of([PHRASE]), (1, 2, 2.0, 0.01))
    new = scaled(tracks, np.array([0]), 0.5)
    np.testing.assert_allclose(new.curve[1], [0.1, 0, 0, 0, 0, 0], atol=1e-15)
    np.testing.assert_allclose(new.curve[2].sum(), 0.1)


@st.composite
def phrases(draw):
    """A fiber's moves and holds about the middle of its stroke, with the numbers of those that quiver."""
    at, moves, shaken = 0.0, [(0.0, 0.15, "smooth")], []
    for number in range(draw(st.integers(2, 6))):
        at += draw(st.floats(0.3, 2.0))
        shape = draw(st.sampled_from(["smooth", "linear", "swell", "hold"]))
        moves.append((at + 1.0, None if shape == "hold" else draw(st.floats(0.08, 0.22)), shape))
        if draw(st.booleans()):
            shaken.append((number + 1, draw(st.floats(0.5, 5.0)), draw(st.floats(1e-3, 8e-3))))
    return [*moves, (at + 3.0, 0.0, "linear"), (at + 6.0, None, "end")], shaken


@settings(max_examples=60, deadline=None)
@given(st.lists(phrases(), min_size=1, max_size=3), st.sampled_from(["clock", "rhythm"]))
def test_a_retimed_score_that_quivers_has_no_snag_that_time_mends_and_stays_as_it_is(make_rig, fibers, keep):
    rig = make_rig(len(fibers), fill=0.5, exhaust=0.35)
    abilities = abilities_of(rig)
    tracks = tracks_of([moves for moves, _ in fibers])
    marks = [
        (tracks.first[f] + k, tracks.first[f] + k + 1, frequency, amplitude)
        for f, (_, shaken) in enumerate(fibers)
        for k, frequency, amplitude in shaken
    ]
    tracks = quivering(tracks, *marks) if marks else tracks
    found = retime(tracks, abilities, rig, np.empty(0), keep=keep)
    assert not [snag for snag in check(found.tracks, rig, abilities).snags if snag.mends]
    again = retime(found.tracks, abilities, rig, np.empty(0), keep=keep)
    assert again.cost == pytest.approx(0.0, abs=1e-6)
