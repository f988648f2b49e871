import re
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import event, given, settings

from composer.fiber.modelled import capability, physics_of
from composer.fiber.problems import problems
from composer.fiber.work import filling_pressure

from .makes import CORD, EACH, PLEAT, any_make, any_mounting, mounted


@settings(max_examples=150, deadline=None)
@given(any_make, any_mounting)
def test_whatever_the_keys_say_is_a_problem_or_a_table_of_numbers(make, mounting):
    found = problems(make, mounting)
    for _, says, expected in found:
        assert not re.search(r"\b(nan|inf)\b", says + expected)
    event("a problem" if found else "a fiber")
    if found:
        return
    able = capability(make, mounting)
    for table in (able.strain, able.fill, able.exhaust, able.air_L):
        assert np.all(np.isfinite(table))
    assert np.all(np.diff(able.strain) > 0.0)
    assert np.all(able.fill > 0.0)
    assert np.all(able.exhaust > 0.0)
    assert np.all(np.diff(able.air_L) >= 0.0)
    assert np.isfinite(able.force_N)
    assert able.stroke > 0.0
    assert able.turn_deg is None or np.isfinite(able.turn_deg)


def test_a_stroke_is_usable_up_to_95_percent_of_the_worst_supply():
    able = capability(CORD, mounted())
    holds = filling_pressure(CORD.shape(), np.array([able.stroke]), 1.5, CORD.friction_fraction)
    assert holds == pytest.approx(0.95 * 400e3)


def test_a_stroke_is_usable_up_to_max_pressure_where_that_is_lower():
    soft = replace(CORD, max_pressure_kPa=250.0)
    able = capability(soft, mounted())
    assert filling_pressure(soft.shape(), np.array([able.stroke]), 1.5, soft.friction_fraction) == pytest.approx(250e3)


def test_force_at_rest_is_the_ideal_one_less_friction():
    able = capability(CORD, mounted())
    ideal = 380e3 * CORD.shape().volume_slope(np.zeros(1))[0] / 0.4
    assert able.force_N == pytest.approx(0.96 * ideal)


def test_more_load_is_less_stroke_and_slower_filling():
    light, heavy = capability(CORD, mounted(load_N=0.5)), capability(CORD, mounted(load_N=10.0))
    assert heavy.stroke < light.stroke
    assert np.interp(0.1, heavy.strain, heavy.fill) < np.interp(0.1, light.strain, light.fill)


def test_near_rest_a_load_drives_a_fiber_home():
    light, heavy = capability(CORD, mounted(load_N=0.0)), capability(CORD, mounted(load_N=10.0))
    assert np.interp(0.01, heavy.strain, heavy.exhaust) > 2.0 * np.interp(0.01, light.strain, light.exhaust)


def test_the_sleeve_ends_a_stroke_before_the_pressure_does():
    assert capability(PLEAT, mounted(load_N=0.0)).stroke == PLEAT.sleeve_limit


@pytest.mark.parametrize("kind", EACH)
def test_lengths_and_degrees_are_those_of_the_kind(kind):
    able = capability(EACH[kind], mounted(load_N=0.5))
    assert (able.turn_deg is None) == (kind in ("contractile", "extensile"))
    assert able.length_mm == (400.0 if kind == "contractile" else 100.0)
    assert able.direction == ("contract" if kind == "contractile" else "extend")


def test_the_thinnest_fiber_of_the_trade_has_a_table(outside):
    thin = replace(CORD, outer_diameter_mm=outside["fibers_of_the_trade"]["thinnest_mm"], wall_mm=0.1)
    able = capability(thin, mounted(load_N=0.05))
    assert able.stroke > 0.2
    assert np.all(able.fill > 0.0)


def test_a_quick_fiber_of_the_trade_is_within_reach_of_a_wide_valve(outside):
    able = capability(CORD, mounted(C=0.1))
    assert np.max(able.fill) * able.length_mm > outside["fibers_of_the_trade"]["speed_mm_s"]


def test_what_moves_a_fiber_travels_with_its_capability():
    physics = physics_of(CORD, mounted(bundle=2, series=3))
    assert physics.count == 6
    assert physics.load == 0.75
    assert physics.settle == 0.015
    assert physics.limit == 450e3
