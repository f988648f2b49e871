import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad, solve_ivp

from composer.fiber import rates
from composer.fiber.gas import MU_WATER, R_AIR, RHO_ANR
from composer.fiber.modelled import capability, physics_of

from . import stiff
from .makes import CORD, EACH, PLEAT, mounted


def stiff_fiber(make, mounting) -> stiff.Fiber:
    """The same fiber for the independent equations, from its keys."""
    L0, r0, wall = make.rest_length_mm * 1e-3, make.outer_diameter_mm * 0.5e-3, make.wall_mm * 1e-3
    G = make.shear_modulus_kPa * 1e3
    if make.direction == "contract":
        a0, k = math.radians(make.braid_angle_deg), make.end_factor
        shape = {
            "volume": lambda e: stiff.contractile_volume(e, L0, r0, a0, k),
            "energy": lambda e: stiff.contractile_energy(e, L0, r0, wall, G, a0, k),
            "stop": (1.0 - math.sqrt(1.0 / 3.0) / math.cos(a0)) / k,
        }
    else:
        shape = {
            "volume": lambda e: stiff.extensile_volume(e, L0, r0),
            "energy": lambda e: stiff.extensile_energy(e, L0, r0, wall, G),
            "stop": make.sleeve_limit,
        }
    return stiff.Fiber(
        **shape,
        wall_volume=math.pi * (r0**2 - (r0 - wall) ** 2) * L0,
        L0=L0,
        load=mounting.load_N / mounting.bundle,
        friction=make.friction_fraction,
        settle=make.settle_ms * 1e-3,
        C=mounting.valve.C_dm3_s_bar * 1e-8,
        b=mounting.valve.b,
        bore=mounting.tube_bore_mm * 1e-3,
        length=mounting.tube_length_mm * 1e-3,
        own_bore=2.0 * (r0 - wall),
        count=mounting.bundle * mounting.series,
        parallel=mounting.bundle,
        n=mounting.supply.polytropic,
    )


MOUNTED = {
    "a loaded cord": (CORD, mounted()),
    "a cord at the end of a long thin tube": (CORD, mounted(tube_length_mm=4000.0, tube_bore_mm=0.8)),
    "a cord on a quick valve": (CORD, mounted(C=0.1)),
    "a bundle": (CORD, mounted(load_N=20.0, bundle=6)),
    "three in series": (CORD, mounted(series=3)),
    "an unloaded pleat": (PLEAT, mounted(load_N=0.0)),
    "an isothermal pleat": (PLEAT, mounted(load_N=0.5, polytropic=1.0)),
}


@pytest.mark.parametrize("name", MOUNTED)
def test_the_tables_times_are_those_of_the_full_equations_within_5_percent(name):
    make, mounting = MOUNTED[name]
    able = capability(make, mounting)
    fiber = stiff_fiber(make, mounting)
    from_e, to_e = 0.05 * able.stroke, 0.95 * able.stroke
    e = np.linspace(from_e, to_e, 3001)
    in_s = np.trapezoid(1.0 / np.interp(e, able.strain, able.fill), e)
    out_s = np.trapezoid(1.0 / np.interp(e, able.strain, able.exhaust), e)
    times = np.linspace(0.0, 3.0 * (in_s + out_s), 20001)
    start, stop = (float(np.interp(at, fiber.e, fiber.holds("in"))) for at in (from_e, 0.999 * able.stroke))
    _, strain, _ = stiff.journey(fiber, start, from_e, stop, 400e3, times)
    assert np.interp(to_e, strain, times) == pytest.approx(in_s, rel=0.05)
    start = float(np.interp(to_e, fiber.e, fiber.holds("out")))
    _, strain, _ = stiff.journey(fiber, start, to_e, 0.0, 400e3, times)
    assert np.interp(-from_e, -strain, times) == pytest.approx(out_s, rel=0.05)


@pytest.mark.parametrize("way", ["fill", "exhaust"])
def test_rates_at_each_strain_are_those_of_the_full_equations(way):
    """Rate by rate, not only the times: the first steps of the full equations from each strain."""
    make, mounting = MOUNTED["a loaded cord"]
    able, fiber = capability(make, mounting), stiff_fiber(*MOUNTED["a loaded cord"])
    for share in (0.1, 0.5, 0.9):
        e = share * able.stroke
        start = float(np.interp(e, fiber.e, fiber.holds("in" if way == "fill" else "out")))
        times = np.linspace(0.0, 0.01, 101)
        _, strain, _ = stiff.journey(fiber, start, e, 399e3 if way == "fill" else 0.0, 400e3, times)
        found = abs(strain[-1] - strain[0]) / 0.01
        assert found == pytest.approx(np.interp((strain[-1] + strain[0]) / 2, able.strain, getattr(able, way)), rel=0.02)


@pytest.mark.parametrize("make", EACH.values(), ids=EACH)
def test_a_bundle_shares_its_load_and_multiplies_air_and_force(make):
    one = capability(make, mounted(load_N=1.0, tube_length_mm=0.0))
    six = capability(make, mounted(load_N=6.0, bundle=6, tube_length_mm=0.0))
    assert six.stroke == pytest.approx(one.stroke, rel=1e-12)
    assert six.force_N == pytest.approx(6.0 * one.force_N)
    assert six.air_L[-1] == pytest.approx(6.0 * one.air_L[-1], rel=1e-9)
    assert six.length_mm == one.length_mm
    # One valve feeds six: a sixth as fast, but for the bores, which are six too.
    assert six.fill == pytest.approx(one.fill / 6.0, rel=0.05)


@pytest.mark.parametrize("make", EACH.values(), ids=EACH)
def test_fibers_end_to_end_add_up_in_length_and_air_but_not_in_force(make):
    one, three = (capability(make, mounted(load_N=1.0, tube_length_mm=0.0, series=n)) for n in (1, 3))
    assert three.stroke == one.stroke
    assert three.force_N == one.force_N
    assert three.length_mm == 3.0 * one.length_mm
    assert three.air_L[-1] == pytest.approx(3.0 * one.air_L[-1], rel=1e-9)
    if one.turn_deg is not None:
        assert three.turn_deg == 3.0 * one.turn_deg


def test_as_many_valves_and_tubes_as_fibers_are_as_fast_as_one():
    one = capability(CORD, mounted(tube_length_mm=0.0))
    bundle = capability(CORD, mounted(load_N=3.0, bundle=2, C=0.010, tube_length_mm=0.0))
    assert bundle.fill == pytest.approx(one.fill, rel=1e-9)
    assert bundle.exhaust == pytest.approx(one.exhaust, rel=1e-9)


def test_longer_and_thinner_tubes_are_slower_and_take_longer_to_answer():
    near = capability(CORD, mounted(C=0.05))
    far = capability(CORD, mounted(C=0.05, tube_length_mm=4000.0, tube_bore_mm=1.0))
    assert np.all(far.fill < near.fill)
    assert np.all(far.exhaust < near.exhaust)
    assert far.physics.delay > near.physics.delay
    assert far.physics.delay == pytest.approx(4.2 / 343.3, abs=5e-4)


@pytest.mark.parametrize("medium", ["air", "water"])
def test_delays_are_whole_milliseconds(medium):
    ms = physics_of(CORD, mounted(medium=medium, tube_length_mm=12345.0)).delay * 1e3
    assert ms == pytest.approx(round(ms), abs=1e-9)
    assert ms == (37.0 if medium == "air" else 8.0)


def test_fill_is_promised_from_the_lower_of_regulator_and_receiver():
    plenty, short = capability(CORD, mounted()), capability(CORD, mounted(min_pressure_kPa=300.0))
    assert short.stroke < plenty.stroke
    regulated = capability(CORD, mounted(pressure_kPa=300.0, min_pressure_kPa=450.0))
    assert short.stroke == regulated.stroke
    assert short.fill == pytest.approx(regulated.fill)


@pytest.mark.parametrize("make", EACH.values(), ids=EACH)
def test_the_ends_of_the_tables_hold_their_rates_within_2_percent_of_stroke(make):
    able = capability(make, mounted(load_N=0.0))
    assert len(able.strain) >= 64
    assert able.held_below == pytest.approx(0.02 * able.stroke)
    assert able.held_above == pytest.approx(0.98 * able.stroke)
    low, high = able.strain <= able.held_below, able.strain >= able.held_above
    assert np.ptp(able.exhaust[low]) == 0.0
    assert np.ptp(able.fill[high]) == 0.0
    assert np.all(able.exhaust > 0.0)
    assert np.all(able.fill > 0.0)


def test_air_drawn_is_the_integral_of_the_gas_balance():
    mounting = mounted()
    able, fiber = capability(CORD, mounting), stiff_fiber(CORD, mounting)
    holds = fiber.holds("in")
    T = 293.15

    def mass_by_strain(e):
        at = int(np.clip(np.searchsorted(fiber.e, e), 1, len(fiber.e) - 1))
        slope = (holds[at] - holds[at - 1]) / (fiber.e[at] - fiber.e[at - 1])
        p = np.interp(e, fiber.e, holds) + 101325.0
        return (fiber.gas(e) * slope / fiber.n + p * np.interp(e, fiber.e, fiber.dV)) / (R_AIR * T)

    moving = quad(mass_by_strain, 0.0, able.stroke, limit=200, epsrel=1e-6)[0]
    begins = fiber.gas(0.0) * holds[0] / fiber.n / (R_AIR * T)
    assert able.air_L[-1] == pytest.approx((moving + begins) / RHO_ANR * 1e3, rel=1e-3)
    assert able.air_L[0] == 0.0
    assert np.all(np.diff(able.air_L) > 0.0)


def test_water_through_a_long_tube_moves_a_fiber_as_hagen_and_poiseuille_say():
    mounting = mounted(C=1000.0, medium="water", tube_length_mm=20_000.0, tube_bore_mm=1.0)
    able = capability(CORD, mounting)
    fiber = stiff_fiber(CORD, mounting)
    resistance = 128.0 * MU_WATER / math.pi * (20.0 / 1e-3**4 + 0.2 / 2e-3**4)
    for share in (0.1, 0.5, 0.9):
        e = share * able.stroke
        P_in, P_out = (float(np.interp(e, fiber.e, fiber.holds(way))) for way in ("in", "out"))
        swell = float(np.interp(e, fiber.e, fiber.dV))
        assert np.interp(e, able.strain, able.fill) == pytest.approx((400e3 - P_in) / resistance / swell, rel=5e-3)
        assert np.interp(e, able.strain, able.exhaust) == pytest.approx(P_out / resistance / swell, rel=5e-3)
    # A stroke of water is the volume that it adds.
    assert able.air_L[-1] == pytest.approx((fiber.gas(able.stroke) - fiber.gas(0.0)) * 1e3, rel=1e-6)


def test_water_knows_no_polytropic_exponent():
    one, other = (capability(CORD, mounted(medium="water", polytropic=n)) for n in (1.0, 1.4))
    assert np.array_equal(one.fill, other.fill)


def test_the_mass_for_a_rise_of_pressure_is_that_of_the_balance():
    """Fill a fiber at a constant mass flow by dP/dt = n (R T m' - P V' e' dP/dt) / V and compare with `capacity`."""
    physics = physics_of(CORD, mounted())
    flow = 1e-6
    e0, e1 = 0.1, 0.12
    P0, P1 = rates.pressures(physics, np.array([e0, e1]))[0]
    at = np.linspace(0.0, 0.3, 30001)
    holds = rates.pressures(physics, at)[0]

    def rise(t, y):
        e = np.interp(y[0], holds, at)
        slope = rates.slopes(physics, np.array([e]))[0]
        return flow / rates.capacity(physics, np.array([e]), y, slope)

    found = solve_ivp(rise, (0.0, 60.0), [P0], rtol=1e-8, events=(arrived := lambda t, y: y[0] - P1), dense_output=True)
    took = found.t_events[0][0]
    V = lambda e: float(rates.gas_volume(physics, np.array(e)))  # noqa: E731
    e = np.linspace(e0, e1, 2001)
    P, volume = np.interp(e, at, holds) + 101325.0, np.array([V(each) for each in e])
    mass = np.sum((volume[1:] + volume[:-1]) / 2 * np.diff(P) / physics.n + (P[1:] + P[:-1]) / 2 * np.diff(volume)) / (
        R_AIR * 293.15
    )
    assert arrived
    assert flow * took == pytest.approx(mass, rel=1e-3)


def test_a_longer_wall_leaves_less_to_fill():
    thin, thick = (physics_of(replace(PLEAT, wall_mm=wall), mounted(load_N=0.0)) for wall in (0.2, 1.5))
    rest = np.zeros(1)
    bore = lambda wall: math.pi * (3e-3 - wall) ** 2 * 0.1 + math.pi * 1e-6 * 0.8  # noqa: E731
    assert rates.gas_volume(thin, rest) == pytest.approx(bore(0.2e-3))
    assert rates.gas_volume(thick, rest) == pytest.approx(bore(1.5e-3))
