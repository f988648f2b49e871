"""Costs and bounds of scores short of air against the best that a long search finds which knows nothing of the retimer."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.retime.retiming import retime

from .air_by_search import Search, scarce

KEEPS = ("clock", "rhythm")
MOST, MEDIAN = 0.02, 0.001
"""How much dearer than what the search finds an answer may be, and the median of many."""


def gap(make_rig, seed: int, keep: str, effort: float) -> float | None:
    """By what share ours costs more than the best found, None where nothing need move; the bound is held below it."""
    score = scarce(seed)
    rig = score.rig(make_rig)
    abilities = abilities_of(rig)
    found = retime(score.tracks, abilities, rig, np.empty(0), keep)
    assert check(found.tracks, rig, abilities).ok, seed
    best = Search(score, keep).best(0, effort)
    assert found.bound <= best * (1.0 + 1e-6) + 1e-9, seed
    return found.cost / best - 1.0 if best > 1e-9 else None


@pytest.mark.parametrize("keep", KEEPS)
@pytest.mark.parametrize("seed", [2, 8, 15])
def test_no_long_search_finds_times_cheaper_by_a_fiftieth(make_rig, seed, keep):
    assert gap(make_rig, seed, keep, 0.5) <= MOST


def test_the_search_itself_finds_what_is_known():
    # One fiber, two strokes of 30 mL on a store of 40 mL: the second landing must wait for the compressor.
    score = scarce(0).__class__(
        [[(0.0, 0.3, "linear"), (1.0, 0.0, "linear"), (2.0, 0.3, "linear"), (3.0, None, "end")]], 30.0, 0.04, 0.005
    )
    # 60 mL out of 40 mL at 5 mL/s from the start on: four seconds, one more than there is.
    assert Search(score, "clock").best(0) == pytest.approx(1.0, abs=1e-4)


@pytest.mark.soak
@pytest.mark.timeout(7200)
@pytest.mark.parametrize("keep", KEEPS)
def test_of_two_hundred_scores_short_of_air_all_cost_what_a_long_search_finds_within_a_fiftieth(make_rig, keep):
    gaps = np.array([each for seed in range(200) if (each := gap(make_rig, seed, keep, 1.0)) is not None])
    assert len(gaps) > 150
    assert gaps.max() <= MOST
    assert np.median(gaps) <= MEDIAN
