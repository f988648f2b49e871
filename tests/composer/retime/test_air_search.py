"""Searching for times that the receiver bears: what is known in closed form, and what every answer must be."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.retime import air_windows, solving
from composer.retime.proof import causes
from composer.retime.retiming import retime

from .air_by_search import scarce
from .scores import tracks_of

NONE = np.empty(0)


def short(make_rig, fibers, store_L, refill_L_s, **more):
    return make_rig(fibers, air_mL=30.0, receiver_L=store_L / 3.5, compressor_L_min=60.0 * refill_L_s, **more)


def test_the_last_of_two_fills_waits_until_the_compressor_has_made_up_what_it_lacks(make_rig):
    track = [(0.0, 0.3, "linear"), (1.0, 0.0, "linear"), (2.0, 0.3, "linear"), (3.0, None, "end")]
    rig = short(make_rig, 1, 0.040, 0.005)
    found = retime(tracks_of([track]), abilities_of(rig), rig, NONE)
    # 60 mL out of 40 mL and 5 mL/s: four seconds from the first breath, one more than there is.
    assert found.tracks.time_s[-1] == pytest.approx(4.0, rel=1e-5)
    assert found.cost == pytest.approx(1.0, rel=1e-5)
    assert [cause.kind for cause in causes(found.proof)] == ["air"]


def test_a_start_leads_where_that_spares_the_ensemble_a_wait(make_rig):
    # The whole fill lies in one span; begun a second earlier it is borne, at a twentieth of what the landing would cost.
    track = [(0.0, None, "hold"), (3.0, 0.3, "linear"), (4.0, None, "end")]
    rig = short(make_rig, 1, 0.020, 0.005)
    found = retime(tracks_of([track]), abilities_of(rig), rig, NONE)
    assert not found.hits_moved
    assert found.tracks.time_s[1] == pytest.approx(2.0, abs=1e-4)
    assert found.cost == pytest.approx(0.05, rel=1e-3)


@settings(max_examples=6, deadline=None)
@given(st.integers(300, 1000), st.sampled_from(["clock", "rhythm"]))
def test_every_answer_is_clean_above_its_bound_and_the_same_again(make_rig, seed, keep):
    score = scarce(seed)
    rig = score.rig(make_rig)
    abilities = abilities_of(rig)
    found = retime(score.tracks, abilities, rig, NONE, keep)
    assert check(found.tracks, rig, abilities).ok
    assert found.bound <= found.cost + 1e-9
    assert np.array_equal(retime(score.tracks, abilities, rig, NONE, keep).tracks.time_s, found.tracks.time_s)
    assert retime(found.tracks, abilities, rig, NONE, keep).cost == 0.0


def test_a_long_score_in_rhythm_is_clean_as_well(make_rig):
    track = []
    for n in range(160):
        # Two strokes in a row at one place only.
        track += [(14.0 * n, 0.3, "linear"), (14.0 * n + 1.0, 0.0, "linear"), (14.0 * n + 2.0, None, "hold")]
        if n == 80:
            track[-1:] = [(14.0 * n + 2.0, 0.3, "linear"), (14.0 * n + 3.0, 0.0, "linear"), (14.0 * n + 4.0, None, "hold")]
    rig = short(make_rig, 1, 0.040, 0.004)
    abilities = abilities_of(rig)
    tracks = tracks_of([[*track[:-1], (track[-1][0], None, "end")]])
    found = retime(tracks, abilities, rig, NONE, "rhythm")
    assert check(found.tracks, rig, abilities).ok
    # 60 mL out of 40 mL and 4 mL/s: five seconds from the first breath to the last, two more than there are. The first move
    # leaves its rest so much earlier, at a twentieth of what a landing would cost.
    assert found.cost == pytest.approx(2.0 / 20.0, rel=1e-4)


def test_a_long_score_is_searched_place_by_place_and_nothing_moves_elsewhere(make_rig, monkeypatch):
    # A hundred lone strokes that the receiver bears, and two places at which it does not.
    fibers = []
    for f in range(2):
        track, at = [], 0.0
        for n in range(100):
            together = n in (30, 70)
            begin = at + (0.0 if together else 5.0 * f)
            track += [(at, None, "hold")] if begin > at else []
            track += [(begin, 0.3, "linear"), (begin + 1.0, None, "hold"), (begin + 2.0, 0.0, "linear")]
            track += [(begin + 3.0, None, "hold")]
            at += 14.0
        # Holds that follow one another are one.
        merged = [move for k, move in enumerate(track) if not (move[2] == "hold" and k and track[k - 1][2] == "hold")]
        fibers.append([*merged[:-1], (merged[-1][0], None, "end")])
    rig = short(make_rig, 2, 0.045, 0.006)
    abilities = abilities_of(rig)
    tracks = tracks_of(fibers)
    assert len([snag for snag in check(tracks, rig, abilities).snags if snag.kind == "air"]) == 2
    searched = []
    plain = air_windows.Search
    monkeypatch.setattr(air_windows, "Search", lambda *more: searched.append(more[-1]) or plain(*more))
    found = retime(tracks, abilities, rig, NONE)
    assert check(found.tracks, rig, abilities).ok
    assert len(searched) == 2
    moved = found.tracks.time_s != tracks.time_s
    places = tracks.time_s[moved]
    assert np.all(((places > 415.0) & (places < 430.0)) | ((places > 975.0) & (places < 990.0)))
    # The same without windows, about the same two places.
    monkeypatch.setattr(solving, "WINDOWS_FROM", 10_000)
    assert found.cost <= retime(tracks, abilities, rig, NONE).cost * (1.0 + 1e-3)
