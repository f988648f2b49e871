"""What fibers draw."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.fills import air_at, drawn, fills_of


def test_a_rated_fiber_draws_its_air_in_proportion_to_the_stroke_it_fills(make_rig, make_tracks):
    abilities = abilities_of(make_rig(1, stroke=0.3, air_mL=3.0))
    fills = fills_of(make_tracks([(1.0, 0.1, "smooth"), (1.0, 0.3, "linear"), (1.0, 0.0, "linear")]), abilities)
    assert fills.segment.tolist() == [0, 1]
    assert fills.litres == pytest.approx([1e-3, 2e-3])


def test_a_sum_that_goes_both_ways_draws_for_its_rises_alone(make_rig, make_tracks):
    abilities = abilities_of(make_rig(1, stroke=0.3, air_mL=3.0))
    fills = fills_of(make_tracks([(2.0, [0.0, 0.8, -0.8, 0.0, 0.0, 0.0])]), abilities)
    assert (fills.u_from, fills.u_to, fills.from_s, fills.to_s) == tuple(pytest.approx([x]) for x in (0.0, 0.5, 0.0, 1.0))
    assert fills.litres == pytest.approx([2e-3])


def test_a_jump_draws_within_one_tick(make_rig, make_tracks):
    abilities = abilities_of(make_rig(1, stroke=0.3, air_mL=3.0))
    tracks = make_tracks([(0.0, 0.3, "step"), (1.0, 0.3, "hold")])
    fills = fills_of(tracks, abilities)
    assert (fills.from_s[0], fills.to_s[0]) == (0.0, 0.005)
    half = drawn(tracks, abilities, fills, np.array([0, 0, 0]), np.array([-1.0, 0.0025, 1.0]))
    assert half == pytest.approx([0.0, 1.5e-3, 3e-3])


def test_a_bundle_draws_for_each_of_its_fibers_through_a_table(make_abilities, make_tracks):
    abilities = make_abilities(([0.0, 0.1, 0.3], [1.0] * 3, [1.0] * 3), air_L=[[0.0, 0.01, 0.05]])
    assert air_at(abilities, np.zeros(4, dtype=int), np.array([-1.0, 0.05, 0.2, 9.0])) == pytest.approx(
        [0.0, 0.005, 0.03, 0.05]
    )
    fills = fills_of(make_tracks([(1.0, 0.2, "linear")]), abilities)
    assert fills.litres == pytest.approx([0.03])


def test_a_sudden_fill_draws_as_it_goes_by_its_rate_table(make_abilities, make_tracks):
    abilities = make_abilities(([0.0, 1.0], [1.0, 3.0], [1.0, 1.0]), air_L=[[0.0, 0.1]])
    tracks = make_tracks([(np.log(3.0) / 2.0, 1.0, "sudden")])
    fills = fills_of(tracks, abilities)
    (half,) = drawn(tracks, abilities, fills, np.array([0]), np.array([0.25]))
    assert half == pytest.approx(0.1 * (np.exp(0.5) - 1.0) / 2.0)
