"""The receiver's account that a search goes by, against the checker's, and its slopes against differences."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.air import use
from composer.retime import air_account
from composer.retime.air_account import account_of
from composer.retime.stage import at_times, stage_of

from .air_by_search import scarce


def of(make_rig, seed, curved=0):
    score = scarce(seed)
    rig = score.rig(make_rig)
    abilities = abilities_of(rig)
    stage = stage_of(score.tracks, abilities, np.empty(0), np.empty(0), None, False)
    every = np.arange(len(stage.events.written_s))
    return stage, rig, abilities, account_of(stage, stage.tracks, rig, abilities, every, curved)


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 300))
def test_what_is_missing_is_what_the_checker_finds(make_rig, seed):
    stage, rig, abilities, account = of(make_rig, seed, 64)
    shift = np.abs(np.random.default_rng(seed).normal(0.0, 0.05)) * np.ones(len(stage.events.written_s))
    missing = account.missing(shift)[0].max()
    lowest = use(at_times(stage, shift), rig.supply, abilities).lowest_kPa
    exact = min((800.0 - lowest) * rig.supply.receiver_L / 100.0, 350.0 * rig.supply.receiver_L)
    if lowest > 0.0:
        assert missing == pytest.approx((800.0 - lowest) * rig.supply.receiver_L / 100.0, rel=2e-3)
    assert account.store == pytest.approx(350.0 * rig.supply.receiver_L / 100.0)
    assert exact >= 0.0


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 300))
def test_rows_are_the_slopes_of_what_spans_lack(make_rig, seed):
    stage, _, _, account = of(make_rig, seed)
    rng = np.random.default_rng(seed)
    # Nothing at one instant, so that there is one slope.
    shift = rng.uniform(0.0, 0.01, len(stage.events.written_s))
    matrix, least = account.rows(shift)
    if not len(least):
        return
    deepest = float(np.max(least - matrix @ shift))
    over = (account.missing(shift)[0].max() - account.store) / account.refill
    assert deepest == pytest.approx(over, abs=1e-9)
    row = int(np.argmax(least - matrix @ shift))
    for event in range(len(shift)):
        step = np.zeros(len(shift))
        step[event] = 1e-7
        there = (account.missing(shift + step)[0].max() - account.store) / account.refill
        back = (account.missing(shift - step)[0].max() - account.store) / account.refill
        # Where another span is as deep, or the deepest point of a curved fill passes on, the slope is that of one side.
        either = (-(there - over) / 1e-7, -(over - back) / 1e-7)
        assert min(either) - 1e-3 <= matrix[row, event] <= max(either) + 1e-3


def test_events_that_stand_still_have_no_column(make_rig):
    stage, rig, abilities, _ = of(make_rig, 3)
    few = account_of(stage, stage.tracks, rig, abilities, np.array([1, 2]))
    assert few.rows(np.zeros(len(stage.events.written_s)))[0].shape[1] == 2


def test_pairs_looked_at_a_block_at_a_time_give_the_same_spans(monkeypatch):
    random = np.random.default_rng(5)
    short = np.cumsum(random.normal(size=400))
    begins, ends = np.arange(0, 400, 2), np.arange(1, 400, 2)
    whole = air_account.Account._deepest(short, begins, ends, 1.0)
    monkeypatch.setattr(air_account, "PAIRS", 1000)
    parts = air_account.Account._deepest(short, begins, ends, 1.0)
    assert len(whole[2]) == air_account.ROWS
    np.testing.assert_allclose(parts[2], whole[2])
    span = short[ends[whole[0]]] - short[begins[whole[1]]]
    np.testing.assert_allclose(span, whole[2])
