import math

import fluids
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.fiber.gas import MU_WATER, R_AIR, T_ANR, air_viscosity
from composer.fiber.pipe import Pipe, delay, friction_factor, isothermal_flow, water_resistance


@pytest.mark.parametrize("reynolds", [10.0, 500.0, 2000.0, 5e3, 1e4, 1e5])
def test_friction_is_that_of_churchill(reynolds):
    assert friction_factor(np.array(reynolds)) == pytest.approx(fluids.friction.Churchill_1977(reynolds, 0.0), rel=1e-9)


def test_laminar_friction_is_64_over_reynolds():
    reynolds = np.array([1e-6, 1.0, 100.0, 1500.0])
    assert friction_factor(reynolds) * reynolds == pytest.approx(np.full(4, 64.0), rel=1e-3)


@pytest.mark.parametrize(("bore", "length"), [(2e-3, 0.8), (2e-3, 4.0), (4e-3, 1.0), (8e-3, 2.0), (0.8e-3, 4.0)])
@pytest.mark.parametrize(("p1", "p2"), [(5e5, 3e5), (5e5, 4.9e5), (2e5, 101325.0)])
def test_flow_is_that_of_the_reference_library_at_the_same_friction(bore, length, p1, p2):
    pipe = Pipe(bore, length)
    flow = float(isothermal_flow(pipe, p1, p2))
    reynolds = 4.0 * flow / (math.pi * bore * air_viscosity(T_ANR))
    friction = float(friction_factor(np.array(reynolds)))
    # The density of the library's formula is the one at the inlet: rho1 / p1 = 1 / (R T).
    rho = p1 / (R_AIR * T_ANR)
    assert flow == pytest.approx(fluids.isothermal_gas(rho, friction, P1=p1, P2=p2, L=length, D=bore), rel=1e-6)


def test_slow_air_is_hagen_and_poiseuilles_at_the_mean_density():
    pipe = Pipe(1e-3, 5.0)
    p1, p2 = 101825.0, 101325.0
    volume = math.pi * pipe.bore**4 * (p1 - p2) / (128.0 * air_viscosity(T_ANR) * pipe.length)
    assert isothermal_flow(pipe, p1, p2) == pytest.approx(volume * (p1 + p2) / 2 / (R_AIR * T_ANR), rel=1e-3)


@settings(max_examples=50)
@given(st.floats(0.3e-3, 2e-2), st.floats(1e-3, 50.0), st.floats(1.05e5, 1.5e6))
def test_flow_never_falls_with_a_greater_drop_and_is_never_faster_than_isothermal_sound(bore, length, p1):
    pipe = Pipe(bore, length)
    low = np.linspace(0.05 * p1, p1, 60)
    flow = isothermal_flow(pipe, np.full_like(low, p1), low)
    assert np.all(np.isfinite(flow))
    assert flow[-1] == 0.0
    # Between laminar and turbulent flow friction rises with the flow, so that the flow itself never turns back.
    assert np.all(np.diff(flow) <= 1e-6 * flow[0])
    assert flow[0] <= pipe.area * p1 / math.sqrt(R_AIR * T_ANR)


def test_no_tube_is_no_restriction():
    assert isothermal_flow(Pipe(2e-3, 0.0), 2e5, 1e5) == math.inf
    assert water_resistance(Pipe(2e-3, 0.0)) == 0.0


def test_tubes_side_by_side_pass_so_many_times_the_flow():
    one, six = Pipe(2e-3, 1.0), Pipe(2e-3, 1.0, 6)
    assert isothermal_flow(six, 3e5, 1e5) == pytest.approx(6.0 * isothermal_flow(one, 3e5, 1e5))
    assert six.volume == pytest.approx(6.0 * one.volume)
    assert water_resistance(six) == pytest.approx(water_resistance(one) / 6.0)


def test_a_step_runs_at_the_speed_of_sound(outside):
    assert delay(Pipe(2e-3, outside["air_20C"]["speed_of_sound"])) == pytest.approx(1.0, rel=1e-3)


def test_water_in_a_tube_is_hagen_and_poiseuilles():
    pipe = Pipe(2e-3, 0.8)
    # A parabola of speeds, summed over rings of the tube for a drop of 1 kPa.
    radius = np.linspace(0.0, 1e-3, 20001)
    speed = 1000.0 / (4.0 * MU_WATER * pipe.length) * (1e-6 - radius**2)
    assert 1000.0 / water_resistance(pipe) == pytest.approx(np.trapezoid(2.0 * np.pi * radius * speed, radius), rel=1e-7)
    # The reference library's friction of laminar flow says the same.
    flow = 1000.0 / water_resistance(pipe)
    v = flow / pipe.area
    drop = fluids.friction.friction_laminar(998.2 * v * 2e-3 / MU_WATER) * pipe.length / 2e-3 * 998.2 * v**2 / 2
    assert drop == pytest.approx(1000.0, rel=1e-9)
