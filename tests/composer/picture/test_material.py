"""A run as a scene."""

from functools import partial

import numpy as np
import pytest

from composer.picture.material import run
from composer.simulate.run import blocks


def test_a_scene_keeps_as_many_columns_as_are_asked_for(make_scene):
    scene = make_scene(columns=123)
    assert scene.share.shape == (4, 123)
    assert all(len(lane.values) == 123 and np.isfinite(lane.values).all() for lane in scene.lanes)


def test_a_miss_that_lasts_less_than_a_column_is_still_in_its_lane(make_piece):
    piece = make_piece(until_s=2.4)
    fine, coarse = run(piece, 2000, 100.0), run(piece, 20, 100.0)
    assert np.nanmax(coarse.kept.miss) == pytest.approx(np.nanmax(fine.kept.miss))
    assert np.nanmax(fine.kept.miss) == pytest.approx(fine.landings.largest / 0.3)


def test_progress_runs_from_little_to_all(make_piece, monkeypatch):
    monkeypatch.setattr("composer.picture.material.blocks", partial(blocks, values=64))
    told = []
    run(make_piece(), 10, 100.0, progress=told.append)
    assert told == sorted(told)
    assert told[-1] == pytest.approx(1.0, abs=0.01)
    assert len(told) > 10
