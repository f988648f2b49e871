"""Retiming again after an edit: what it finds is what a retiming from nothing finds."""

from dataclasses import replace

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.retime import memory
from composer.retime.retimer import Choices, Retimer
from composer.retime.retiming import retime

from .scores import random_score, tracks_of


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 10_000), st.sampled_from(["clock", "rhythm"]), st.booleans())
def test_an_edit_ends_where_a_retiming_from_nothing_does(make_rig, seed, keep, other):
    rig = make_rig(4, accel=(None, 3.0)[seed % 2])
    abilities = abilities_of(rig)
    made = random_score(seed)
    # Another target for a move or another instant for a knot; or another score altogether.
    if other:
        new = random_score(seed + 1).tracks
    else:
        rng = np.random.default_rng(seed)
        moves = np.flatnonzero(made.tracks.manner == 1)
        k = int(rng.choice(moves))
        curve = made.tracks.curve.copy()
        curve[k, 1:] *= 0.8
        curve[k + 1, 0] = curve[k].sum()
        new = replace(made.tracks, curve=curve)
    first = Retimer.of(made.tracks, abilities, rig, Choices(made.pins_s, keep))
    again = first.edited(new).retiming
    fresh = retime(new, abilities, rig, made.pins_s, keep)
    assert bool(again.pins_short) == bool(fresh.pins_short)
    if not fresh.pins_short:
        assert abs(again.cost - fresh.cost) <= 1e-9 * max(1.0, fresh.cost)
        assert np.abs(again.tracks.time_s - fresh.tracks.time_s).max() <= 1e-6


def test_choices_may_change_with_the_tracks(make_rig):
    rig = make_rig(1)
    tracks = tracks_of([[(0.0, 0.3, "linear"), (0.25, None, "hold"), (1.0, 0.0, "linear"), (3.0, None, "end")]])
    first = Retimer.of(tracks, abilities_of(rig), rig, Choices(np.empty(0)))
    again = first.edited(tracks, Choices(np.empty(0), "rhythm"))
    assert first.retiming.tracks.time_s[-1] == 3.0
    assert again.retiming.tracks.time_s[-1] == 3.25


def test_only_segments_that_are_new_are_measured_again(make_rig, monkeypatch):
    measured = []
    plain = memory.least_durations
    monkeypatch.setattr(memory, "least_durations", lambda t, a, k: measured.append(len(k)) or plain(t, a, k))
    rig = make_rig(4)
    made = random_score(7)
    first = Retimer.of(made.tracks, abilities_of(rig), rig, Choices(np.empty(0)))
    first.edited(replace(made.tracks, time_s=made.tracks.time_s * 1.1))
    assert measured == [len(first.retiming.proof.tracks.time_s)]
    curve = made.tracks.curve.copy()
    k = int(np.flatnonzero(made.tracks.manner == 1)[0])
    curve[k, 1:] *= 0.9
    first.edited(replace(made.tracks, curve=curve))
    assert measured[1:] == [1]
