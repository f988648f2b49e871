"""Every answer against a sampler that knows strains over time alone: no shapes, no events, no rows."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.motion import strain_at
from composer.retime.retiming import retime

from .scores import random_score

FILL, EXHAUST = 0.6, 0.3


@settings(max_examples=20, deadline=None)
@given(st.integers(0, 10_000), st.sampled_from(["clock", "rhythm"]))
def test_no_sampled_strain_changes_faster_than_its_fiber_can(make_rig, seed, keep):
    rig = make_rig(4, fill=FILL, exhaust=EXHAUST)
    made = random_score(seed, pins=False)
    found = retime(made.tracks, abilities_of(rig), rig, np.empty(0), keep)
    times = np.linspace(0.0, found.tracks.duration_s, 20_001)
    change = np.diff(strain_at(found.tracks, abilities_of(rig), times), axis=1) / np.diff(times)
    assert change.max() <= FILL * (1.0 + 2e-6) + 1e-9
    assert change.min() >= -EXHAUST * (1.0 + 2e-6) - 1e-9


@settings(max_examples=3, deadline=None)
@given(st.integers(0, 10_000))
def test_no_receiver_reckoned_from_samples_falls_below_its_least(make_rig, seed):
    rig = make_rig(4, fill=FILL, exhaust=EXHAUST, air_mL=30.0, receiver_L=0.012, compressor_L_min=0.9)
    made = random_score(seed, pins=False, moves=3)
    found = retime(made.tracks, abilities_of(rig), rig, np.empty(0))
    times = np.linspace(0.0, found.tracks.duration_s, 20_001)
    rising = np.maximum(np.diff(strain_at(found.tracks, abilities_of(rig), times), axis=1), 0.0)
    asked = 0.030 * rising.sum(axis=0) / 0.3
    level = full = 0.012 * 350.0 / 100.0
    lowest = full
    for litres in asked:
        level = min(level + 0.015 * (times[1] - times[0]) - litres, full)
        lowest = min(lowest, level)
    # Filling up before it draws, within one sample, is the sampler's own error.
    assert lowest >= -asked.max() - 1e-6


@pytest.mark.parametrize("keep", ["clock", "rhythm"])
def test_those_who_landed_together_are_seen_to_land_together(make_rig, keep):
    rig = make_rig(4)
    made = random_score(11, pins=False)
    found = retime(made.tracks, abilities_of(rig), rig, np.empty(0), keep)
    was, now = found.warp_was_s, found.warp_now_s
    for hit in found.hits_moved:
        assert np.interp(hit.was_s, was, now) == pytest.approx(hit.now_s, abs=1e-9)
