"""A score on the simulated rig, and how well it lands."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.shapes import PROGRESS
from composer.simulate.hits import LandingLog
from composer.simulate.run import blocks
from composer.tracks import HOLD, MOVE, Tracks


def tracks_of(*segments, fibers=1, tail=1.0):
    """Tracks of like fibers that make moves of (start s, end s, target, shape), holding between."""
    times, curves, manners, at, now = [], [], [], 0.0, 0.0
    for start, end, target, shape in segments:
        if start > now or not times:
            times.append(now)
            curves.append(np.eye(6)[0] * at)
            manners.append(HOLD)
        times.append(start)
        curves.append(np.eye(6)[0] * at + (target - at) * PROGRESS[shape])
        manners.append(MOVE)
        at, now = target, end
    times.append(now)
    curves.append(np.eye(6)[0] * at)
    manners.append(HOLD)
    count = len(times)
    zeros = np.zeros(count * fibers, np.int32)
    return Tracks(
        np.arange(fibers + 1) * count,
        np.tile(times, fibers),
        np.tile(curves, (fibers, 1)),
        np.tile(np.array(manners, np.int8), fibers),
        zeros.astype(np.int8),
        zeros,
        zeros,
        now + tail,
    )


def land(tracks, rig, **how):
    log = LandingLog(tracks, abilities_of(rig).stroke)
    for block in blocks(tracks, rig, abilities_of(rig), **how):
        log.add(block)
    return log.landings()


EASY = tracks_of((0.2, 1.2, 0.3, "smooth"), (1.3, 2.3, 0.0, "linear"), fibers=2)


@pytest.mark.parametrize("drive", ["pressure", "strain", "valve"])
@pytest.mark.parametrize("rate_Hz", [100.0, 333.0, 2000.0])
def test_what_a_rig_can_do_it_does_without_error_at_any_tick(make_rig, drive, rate_Hz):
    found = land(EASY, make_rig(2, drive=drive), rate_Hz=rate_Hz)
    assert found.largest < 1e-9
    assert np.abs(found.error).max() < 0.3 / rate_Hz / 4
    assert not found.late_s.any()


def test_without_its_lead_every_fiber_is_late_by_its_valves_response(make_rig):
    hasty = tracks_of((0.5, 1.0, 0.3, "linear"))
    with_lead, without = (land(hasty, make_rig(1), rate_Hz=500.0, inverse=on) for on in (True, False))
    assert with_lead.largest < 1e-9
    assert without.largest == pytest.approx(0.6 * 0.008, abs=0.6 * 0.0021)
    assert without.error[0] < -0.003


def test_a_linear_move_at_twice_the_fill_rate_is_late_by_what_is_missing(make_rig):
    found = land(tracks_of((1.0, 1.25, 0.3, "linear")), make_rig(1))
    assert found.error[0] == pytest.approx(-0.15, abs=1e-9)
    assert found.largest == pytest.approx(0.15, abs=1e-9)
    assert found.largest_s == pytest.approx(1.25)
    # It passes 95 % of 0.3 at 0.285 / 0.6 s after it left.
    assert found.late_s[0] == pytest.approx(0.475 - 0.25, abs=1e-9)


def test_a_move_never_done_before_the_next_but_one_has_no_lateness(make_rig):
    flurry = tracks_of((1.0, 1.1, 0.3, "linear"), (1.1, 1.2, 0.0, "linear"), (1.2, 1.3, 0.3, "linear"))
    found = land(flurry, make_rig(1), rate_Hz=1000.0)
    assert np.isnan(found.late_s[0])
    # It is at 0.0818 when the third move's line meets it, 27 ms after the second ends, and fills from there.
    assert found.late_s[2] == pytest.approx(0.3 / 11 + (0.285 - (0.09 - 0.09 / 11)) / 0.6 - 0.1, abs=0.001)


def test_a_late_arrival_after_the_scores_last_instant_is_still_seen(make_rig):
    found = land(tracks_of((0.2, 0.3, 0.3, "linear"), tail=0.0), make_rig(1))
    assert found.late_s[0] == pytest.approx(0.475 - 0.1, abs=1e-9)


def test_hits_come_in_order_of_time_and_name_their_fiber(make_rig):
    found = land(EASY, make_rig(2))
    assert found.time_s.tolist() == [1.2, 1.2, 2.3, 2.3]
    assert sorted(found.fiber[:2].tolist()) == [0, 1]


def test_blocks_follow_each_other_tick_by_tick_from_the_start_to_past_the_end(make_rig, monkeypatch):
    monkeypatch.setattr("composer.simulate.run.BLOCK", 64)
    times = np.concatenate([block.time_s for block in blocks(EASY, make_rig(2), abilities_of(make_rig(2)), 100.0)])
    assert times == pytest.approx(np.arange(len(times)) * 0.01)
    assert times[-1] == pytest.approx(4.3)
    small = land(EASY, make_rig(2), rate_Hz=100.0)
    monkeypatch.setattr("composer.simulate.run.BLOCK", 1 << 17)
    assert small.error == pytest.approx(land(EASY, make_rig(2), rate_Hz=100.0).error)
