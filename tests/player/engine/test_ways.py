"""Safe ways from anywhere to anywhere."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from player.engine.ways import SAFE, safe_ways

strains = st.lists(st.floats(0.0, 0.3), min_size=4, max_size=4).map(np.array)


@settings(deadline=None, max_examples=40)
@given(strains, strains)
def test_no_way_is_faster_than_two_thirds_of_the_rate_of_its_direction(make_rig, a, b):
    ways = safe_ways(abilities_of(make_rig(4)), a, b)
    times = np.linspace(0.0, ways.longest_s + 0.1, 2000)
    rates = np.diff([ways.at(t) for t in times], axis=0) / (times[1] - times[0])
    assert rates.max() <= 0.6 / SAFE + 1e-6 and rates.min() >= -0.3 / SAFE - 1e-6


@settings(deadline=None, max_examples=40)
@given(strains, strains)
def test_every_way_begins_and_ends_where_it_was_asked_to(make_rig, a, b):
    ways = safe_ways(abilities_of(make_rig(4)), a, b)
    assert np.array_equal(ways.at(ways.longest_s), b)
    assert np.allclose(ways.at(0.0), np.where(ways.lasts_s > 0.0, a, b), atol=1e-12)


def test_no_way_takes_no_time(make_rig):
    at = np.full(4, 0.2)
    assert safe_ways(abilities_of(make_rig(4)), at, at).longest_s == 0.0


def test_a_way_down_takes_as_long_as_a_minimum_jerk_move_at_two_thirds_of_the_exhaust_rate(make_rig, outside):
    ways = safe_ways(abilities_of(make_rig(1)), np.array([0.3]), np.zeros(1))
    assert ways.longest_s == pytest.approx(SAFE * 15.0 / 8.0 * 0.3 / 0.3, rel=1e-9)


def test_a_fiber_with_an_acceleration_limit_stays_within_it(make_rig):
    ways = safe_ways(abilities_of(make_rig(1, accel=0.5)), np.array([0.3]), np.zeros(1))
    times = np.linspace(0.0, ways.longest_s, 4000)
    strain = np.array([ways.at(t)[0] for t in times])
    assert np.abs(np.diff(strain, 2)).max() / (times[1] - times[0]) ** 2 <= 0.5 / SAFE**2 * 1.001
