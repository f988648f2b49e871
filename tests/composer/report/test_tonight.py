"""What fibers will do tonight, against the run itself and closed forms."""

import json
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.report import tonight
from composer.report.tonight import Watch, as_json, foretold, sentences, warming_s
from composer.shapes import PROGRESS
from composer.simulate.hits import LandingLog
from composer.simulate.run import Block, blocks
from composer.tracks import HOLD, MOVE, Tracks

ARRAYS = ("time_s", "target", "strain", "pressure_kPa", "supply_kPa", "duty")


def place(seconds):
    return f"{int(seconds // 4) + 1}:{seconds % 4 + 1:g}"


def rising(count=4, lasts_s=2.0, until_s=8.0, to=0.3):
    """Tracks of fibers that rise from 2 s on and stay."""
    curve = np.array([np.zeros(6), to * PROGRESS["smooth"], to * np.eye(6)[0]])
    return Tracks(
        np.arange(count + 1) * 3, np.tile([0.0, 2.0, 2.0 + lasts_s], count), np.tile(curve, (count, 1)),
        np.tile(np.array([HOLD, MOVE, HOLD], np.int8), count), np.zeros(3 * count, np.int8),
        np.tile(np.array([0, 7, 7], np.int32), count), np.zeros(3 * count, np.int32), until_s,
    )  # fmt: skip


def always(on_s, rest_s, step=0.01, fibers=1):
    """A block in which fibers move all the time for a while and then stand."""
    time = np.arange(0.0, on_s + rest_s + step / 2, step)
    strain = np.tile(np.minimum(time, on_s) * 1e-3, (fibers, 1))
    none = np.zeros(len(time))
    return Block(time, strain, strain, strain, none + 600.0, none, 0.0)


@given(duty=st.floats(0.05, 0.95), burst=st.floats(0.5, 60.0))
def test_a_coil_on_from_cold_is_as_warm_as_its_duty_allows_when_its_allowance_ends(duty, burst):
    tau = warming_s(np.array([duty]), np.array([burst]))[0]
    end_s = burst / (1.0 - duty)
    assert (1.0 - np.exp(-end_s / tau)) / duty == pytest.approx(1.0)


def test_no_warmth_is_told_of_a_coil_that_may_be_on_for_ever_or_has_no_burst():
    assert np.isnan(warming_s(np.array([1.0, 0.6]), np.array([30.0, 0.0]))).all()


def test_warmth_rises_and_falls_as_one_body_that_warms_and_cools(make_rig):
    rig = make_rig(1, duty=0.5, duty_burst_s=10.0)
    abilities = abilities_of(rig)
    tau = float(warming_s(np.array([0.5]), np.array([10.0]))[0])
    watch = Watch(rig, abilities)
    block = always(6.0, 5.0)
    for begin in range(0, len(block.time_s), 77):
        part = slice(begin, begin + 77)
        cut = {name: getattr(block, name)[..., part] for name in ARRAYS}
        watch.add(replace(block, **cut))
    assert watch._warmest[0] == pytest.approx((1.0 - np.exp(-6.0 / tau)) / 0.5, rel=1e-3)
    assert watch._warm[0] == pytest.approx(watch._warmest[0] * np.exp(-5.0 / tau), rel=1e-3)


def test_the_duty_of_all_groups_together_is_what_the_run_itself_counts(make_rig):
    rig = make_rig(5, duty=0.2, duty_burst_s=2.0)
    rig = replace(rig, groups={"first": (0, 1), "both": (1, 2)})
    abilities, tracks = abilities_of(rig), rising(5)
    watch, log = Watch(rig, abilities), LandingLog(tracks, abilities.stroke)
    highest = 0.0
    for block in blocks(tracks, rig, abilities):
        watch.add(block)
        log.add(block)
        highest = max(highest, float(block.duty.max()))
    found = watch.tonight(log.landings(), place, tracks)
    assert [group.group for group in found.groups] == ["first", "both", "the others"]
    assert max(group.duty for group in found.groups) == pytest.approx(highest, rel=0.01)
    assert all(group.end_duty <= group.duty for group in found.groups)
    assert 2.0 < found.groups[0].at_s < 4.5


def test_the_lowest_pressure_is_named_with_its_place_and_what_is_left_at_the_end(make_rig):
    rig = make_rig(4, air_mL=2000.0, receiver_L=5.0, compressor_L_min=60.0)
    found = foretold(rising(), rig, abilities_of(rig), place)
    assert found.lowest_kPa < 800.0
    assert 2.0 < found.lowest_at_s < 4.6
    assert found.lowest_place == place(found.lowest_at_s)
    assert found.end_kPa > found.lowest_kPa
    assert found.used_L == pytest.approx(4 * 2.0, rel=1e-3)
    assert f"{found.lowest_kPa:.0f} kPa" in sentences(found)[0]


def test_a_rig_short_of_air_is_said_to_be_short(make_rig):
    rig = make_rig(4, air_mL=7000.0, receiver_L=5.0, compressor_L_min=0.0)
    found = foretold(rising(), rig, abilities_of(rig), place)
    assert found.lowest_kPa < found.needed_kPa
    assert "short of what fibers need" in sentences(found)[0]


def test_landings_that_miss_are_named_once_a_line_and_those_that_never_come_first(make_rig):
    rig = make_rig(4)
    # A stroke in a fifth of the time that it takes.
    found = foretold(rising(lasts_s=0.1), rig, abilities_of(rig), place)
    assert (found.landings, found.missed) == (4, 4)
    assert [hit.line for hit in found.closest] == [7]
    assert found.closest[0].late_s > 0.1
    assert "4 of 4 landings miss" in " ".join(sentences(found))


def test_a_run_within_all_limits_says_so(make_rig):
    rig = make_rig(2, duty=1.0)
    told = " ".join(sentences(foretold(rising(2), rig, abilities_of(rig), place)))
    assert "All 2 landings are met." in told
    assert "miss" not in told


def test_json_holds_no_number_that_json_has_not(make_rig):
    rig = make_rig(2, duty=1.0)
    text = json.dumps(as_json(foretold(rising(2), rig, abilities_of(rig), place)), allow_nan=False)
    assert json.loads(text)["groups"][0]["heat"] is None
    assert set(json.loads(text)) == set(tonight.Tonight.__dataclass_fields__)
