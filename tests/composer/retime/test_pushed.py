"""A pass forward in time that proves itself, against the solver."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.retime.pushed import pushed
from composer.retime.retiming import retime
from composer.retime.stage import stage_of
from composer.retime.terms import cost, tilted

from .scores import random_score, tracks_of

NONE = np.empty(0)


def of(make_rig, tracks, keep=False):
    stage = stage_of(tracks, abilities_of(make_rig(tracks.fibers)), NONE, NONE, None, keep)
    priced, most = tilted(stage.events, stage.terms)
    return stage, pushed(stage.events, stage.rows, priced), most


def test_a_path_too_fast_from_the_start_is_solved_by_one_pass(make_rig):
    tracks = tracks_of([[(0.0, 0.3, "linear"), (0.1, 0.0, "linear"), (0.2, 0.15, "linear"), (0.3, None, "end")]])
    stage, found, most = of(make_rig, tracks)
    shift, dual = found
    assert shift.tolist() == pytest.approx([0.4, 1.3, 1.45])
    # Each row bears the strokes of all that it pushes.
    assert np.sort(dual[dual > 0.0]).tolist() == pytest.approx([0.5, 1.5, 2.5])
    assert dual @ stage.rows.least / most == pytest.approx(cost(stage.terms, shift))


def test_a_pass_is_not_believed_where_what_is_light_would_give_way_earlier(make_rig):
    tracks = tracks_of([[(0.0, 0.03, "linear"), (1.0, 0.3, "linear"), (1.1, None, "end")]])
    assert of(make_rig, tracks)[1] is None
    assert retime(tracks, abilities_of(make_rig(1)), make_rig(1), NONE).tracks.time_s[1] == pytest.approx(0.65)


def test_a_pass_is_not_tried_where_rhythm_is_kept(make_rig):
    tracks = tracks_of([[(0.0, 0.3, "linear"), (0.1, 0.0, "linear"), (0.2, None, "end")]])
    assert of(make_rig, tracks, True)[1] is None
    assert of(make_rig, tracks)[1] is not None


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 10_000), st.integers(1, 2), st.floats(0.05, 1.0))
def test_what_a_pass_proves_is_what_the_solver_finds(make_rig, seed, fibers, squeezed):
    made = random_score(seed, fibers=fibers, pins=False, sudden=False)
    tracks = tracks_at(made.tracks, squeezed)
    rig = make_rig(fibers)
    found = of(make_rig, tracks)[1]
    whole = retime(tracks, abilities_of(rig), rig, NONE, whole=True)
    ours = retime(tracks, abilities_of(rig), rig, NONE)
    assert ours.cost == pytest.approx(whole.cost, abs=1e-9)
    assert ours.bound == pytest.approx(ours.cost, abs=1e-8)
    assert ours.tracks.time_s == pytest.approx(whole.tracks.time_s, abs=1e-7)
    if found is not None:
        assert whole.proof.shift_s == pytest.approx(found[0], abs=1e-7)


def test_a_pass_proves_many_squeezed_paths(make_rig):
    proven = [of(make_rig, tracks_at(random_score(n, fibers=1, pins=False, sudden=False).tracks, 0.1))[1] for n in range(40)]
    assert sum(one is not None for one in proven) >= 10


def tracks_at(tracks, factor):
    return replace(tracks, time_s=tracks.time_s * factor, duration_s=tracks.duration_s * factor)
