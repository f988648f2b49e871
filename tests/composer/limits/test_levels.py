"""Where tracks lie past a level, against dense sampling."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.levels import lasting, past, time_share


def test_a_linear_move_is_above_half_way_for_half_of_its_time(make_rig, make_tracks):
    tracks = make_tracks([(2.0, 0.3, "linear")])
    row, start, end = past(tracks, abilities_of(make_rig(1)), np.array([0]), np.array([0.15]), above=True)
    assert (row.tolist(), start, end) == ([0], pytest.approx([0.5]), pytest.approx([1.0]))


def test_a_sum_may_pass_a_level_more_than_once(make_rig, make_tracks):
    wave = np.poly([0.2, 0.5, 0.9])[::-1]
    tracks = make_tracks([(1.0, [*wave, 0.0, 0.0])])
    _, start, end = past(tracks, abilities_of(make_rig(1)), np.array([0]), np.array([0.0]), above=True)
    assert start == pytest.approx([0.2, 0.9])
    assert end == pytest.approx([0.5, 1.0])
    _, start, _ = past(tracks, abilities_of(make_rig(1)), np.array([0]), np.array([0.0]), above=False)
    assert start == pytest.approx([0.0, 0.5])


def test_a_sudden_move_passes_a_strain_when_its_rate_table_says(make_abilities, make_tracks):
    abilities = make_abilities(([0.0, 1.0], [1.0, 3.0], [1.0, 1.0]))
    tracks = make_tracks([(np.log(3.0) / 2.0, 1.0, "sudden")])
    share = time_share(tracks, abilities, np.array([0]), np.array([0.5]))
    assert share == pytest.approx([np.log(2.0) / np.log(3.0)])


def test_the_hold_at_the_end_lasts_to_the_end_of_the_score(make_tracks):
    assert lasting(make_tracks([(1.0, 0.1, "linear")], duration_s=4.0)).tolist() == [1.0, 3.0]
