import math

import fluids
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import solve_ivp

from composer.fiber.gas import GAMMA, R_AIR, RHO_ANR, RHO_WATER, T_ANR
from composer.fiber.orifice import (
    CONDUCTANCE_PER_AREA,
    NEARLY_EQUAL,
    Orifice,
    mass_flow,
    orifice,
    throughput,
    upstream_pressure,
    water_area,
    water_flow,
)

bars = st.floats(1e4, 2e6)
ratios = st.floats(0.0, 0.95)


def nozzle(area_m2: float, pressure: float) -> float:
    """Choked mass flow in kg/s of a perfect nozzle at 20 °C."""
    power = (GAMMA + 1.0) / (2.0 * (GAMMA - 1.0))
    return area_m2 * pressure * math.sqrt(GAMMA / (R_AIR * T_ANR)) * (2.0 / (GAMMA + 1.0)) ** power


def test_a_perfect_nozzle_chokes_at_the_critical_ratio(outside):
    assert pytest.approx(outside["critical_ratio"]["value"], abs=5e-7) == (2.0 / (GAMMA + 1.0)) ** (GAMMA / (GAMMA - 1.0))
    assert fluids.P_critical_flow(1.0, GAMMA) == pytest.approx(outside["critical_ratio"]["value"], abs=5e-7)


def test_choked_air_through_a_square_millimetre_is_that_of_a_nozzle(outside):
    choked = outside["choked_air"]
    assert nozzle(1e-6, 500e3) == pytest.approx(choked["kg_per_s"], rel=1e-4)
    opening = orifice(choked["C_dm3_s_bar"], outside["critical_ratio"]["value"])
    assert mass_flow(opening, 500e3, 100e3) == pytest.approx(choked["kg_per_s"], rel=1e-4)
    assert pytest.approx(choked["C_dm3_s_bar"], rel=1e-9) == CONDUCTANCE_PER_AREA * 1e2


def test_the_ellipse_is_within_two_hundredths_of_isentropic_flow(outside):
    b = outside["critical_ratio"]["value"]
    x = np.linspace(b, 0.99, 50)
    isentropic = np.sqrt(x ** (2 / GAMMA) - x ** ((GAMMA + 1) / GAMMA))
    isentropic /= isentropic[0]
    assert throughput(x, b) == pytest.approx(isentropic, abs=0.02)


@given(bars, bars, ratios)
def test_flow_turns_round_with_the_pressures_and_never_against_them(one, other, b):
    opening = Orifice(5e-11, b)
    there, back = float(mass_flow(opening, one, other)), float(mass_flow(opening, other, one))
    assert there == -back
    assert there * (one - other) >= 0.0


@given(bars, ratios)
def test_flow_grows_with_the_drop_and_jumps_nowhere(pressure, b):
    low = np.linspace(0.0, pressure, 4001)
    flow = mass_flow(Orifice(5e-11, b), np.full_like(low, pressure), low)
    assert np.all(np.diff(flow) <= 1e-12 * flow[0])
    # The steepest place is the straight end.
    bend = max(NEARLY_EQUAL, (1.0 + b) / 2.0)
    steepest = float(throughput(np.array(bend), b)) / (1.0 - bend)
    assert np.max(-np.diff(flow)) <= flow[0] * steepest / 4000 * (1.0 + 1e-6)
    assert flow[-1] == 0.0


@given(bars, st.floats(1e-12, 0.99999), ratios)
def test_the_pressure_upstream_is_the_one_that_drives_the_flow(p1, ratio, b):
    opening = Orifice(5e-11, b)
    flow = mass_flow(opening, p1, np.array(ratio * p1))
    back = upstream_pressure(opening, flow, np.array(ratio * p1))
    assert back == pytest.approx(p1, rel=1e-8)


def test_no_pressure_on_either_side_is_no_flow():
    assert mass_flow(Orifice(5e-11, 0.3), 0.0, 0.0) == 0.0


def test_a_rigid_volume_empties_by_the_law_of_choked_blow_down():
    opening, V, p0 = Orifice(5e-11, 0.3), 1e-5, 900e3
    k = opening.C * RHO_ANR * R_AIR * T_ANR / V
    until = math.log(p0 * 0.3 / 101325.0) / k  # choked up to here
    found = solve_ivp(
        lambda t, p: -mass_flow(opening, p, 101325.0) * R_AIR * T_ANR / V,
        (0.0, until),
        [p0],
        rtol=1e-10,
        atol=1e-4,
        t_eval=[until],
    )
    assert found.y[0, -1] == pytest.approx(p0 * math.exp(-k * until), rel=1e-8)


def test_a_rigid_volume_fills_in_a_straight_line_while_the_valve_is_choked():
    opening, V, supply = Orifice(5e-11, 0.3), 1e-5, 900e3
    slope = opening.C * supply * RHO_ANR * R_AIR * T_ANR / V
    until = (0.3 * supply - 101325.0) / slope
    found = solve_ivp(
        lambda t, p: mass_flow(opening, supply, p) * R_AIR * T_ANR / V, (0.0, until), [101325.0], rtol=1e-10, atol=1e-4
    )
    assert found.y[0, -1] == pytest.approx(101325.0 + slope * until, rel=1e-8)


def test_warmer_air_passes_with_the_root_of_its_temperature():
    opening = Orifice(5e-11, 0.3)
    assert mass_flow(opening, 5e5, 1e5, 4 * T_ANR) == pytest.approx(mass_flow(opening, 5e5, 1e5) / 2)


def test_water_through_an_orifice_alone_is_bernoullis():
    area = water_area(orifice(0.19919, 0.5))
    assert area == pytest.approx(1e-6)
    assert water_flow(area, 0.0, np.array(2e5)) == pytest.approx(area * math.sqrt(2 * 2e5 / RHO_WATER))


@given(st.floats(1e-9, 1e-5), st.floats(0.0, 1e15), st.floats(-1e6, 1e6))
def test_orifice_and_tube_share_the_drop_of_water(area, resistance, drop):
    flow = float(water_flow(area, resistance, np.array(drop)))
    shared = RHO_WATER / (2 * area**2) * flow * abs(flow) + resistance * flow
    assert shared == pytest.approx(drop, rel=1e-9, abs=1e-280)
