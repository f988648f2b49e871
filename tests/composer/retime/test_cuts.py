"""Spans of on-time that a coil cannot bear, and their rows."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.retime.cuts import duty_rows, duty_spans, lengthened
from composer.retime.stage import at_times, stage_of

from .scores import tracks_of


@pytest.fixture
def hot(make_rig):
    track, at = [], 0.0
    for n in range(6):
        track += [(at, 0.3 if n % 2 == 0 else 0.0, "linear"), (at + 1.0, None, "hold")]
        at += 1.1
    rig = make_rig(1, duty=0.5, duty_burst_s=2.0)
    abilities = abilities_of(rig)
    tracks = tracks_of([[*track, (at, None, "end")]])
    return stage_of(tracks, abilities, np.empty(0), np.empty(0), None, False), rig, abilities


def test_a_span_runs_from_the_first_energised_segment_to_the_one_that_overdraws(hot):
    stage, rig, abilities = hot
    spans = duty_spans(stage.tracks, rig, abilities, set())
    # Each period is on for 1.0 s and bears 0.55 s: four of them ask for 4 s less 2.15 s, and no more than 2 s may be missing.
    assert (0, 10) in spans
    assert all(first % 2 == 0 and last % 2 == 0 for first, last in spans)


def test_spans_that_are_known_are_not_found_again(hot):
    stage, rig, abilities = hot
    spans = duty_spans(stage.tracks, rig, abilities, set())
    assert duty_spans(stage.tracks, rig, abilities, set(spans)) == []


def test_a_row_is_the_on_time_of_its_span_less_what_the_coil_bears(hot):
    stage, rig, abilities = hot
    rows = duty_rows([(0, 10)], stage.tracks, stage.events, rig, abilities)
    assert rows.least == pytest.approx([6.0 - 2.0 - 0.5 * 6.5])
    rng = np.random.default_rng(0)
    shift = rng.uniform(-0.04, 0.04, len(stage.events.written_s))
    now = at_times(stage, shift)
    lasts = np.diff(now.time_s[:12])
    assert rows.matrix @ shift - rows.least == pytest.approx([2.0 + 0.5 * lasts[:11].sum() - lasts[:11:2].sum()])


def test_lengthened_tracks_have_no_segment_without_length():
    tracks = lengthened(tracks_of([[(0.0, 0.3, "linear"), (0.0, 0.0, "linear"), (0.0, None, "end")]]))
    assert np.diff(tracks.time_s).tolist() == [1.0, 1.0]
