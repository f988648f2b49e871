"""Simulated modelled fibers, held against an independent stiff solution of the full equations."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.rig.reading import read_rig
from composer.simulate.modelled import LONGEST_S, parts_of, settled
from composer.simulate.rig import SimulatedRig

from ..fiber import stiff
from ..fiber.makes import CORD, EACH, PLEAT, mounted
from ..fiber.rigs import rig_of
from ..fiber.test_rates import stiff_fiber

SEQUENCE = ((0.0, 0.5), (1.2, 0.48), (1.6, 1.0), (3.5, 0.45), (4.5, 0.0))
"""Seconds and share of full pressure: fill, a reversal within the friction band, full, part of the way back, exhaust."""


def rig_for(kind, make, load_N=1.5, **values):
    hung = f"load_N = {load_N}\ntube_bore_mm = 2.0\ntube_length_mm = 800"
    return read_rig(rig_of(kind, make, hung, **values), "bench.rig.toml")


def run(rig, tick, until, command):
    """Times and strains (T,), pressures (T,) in kPa of one fiber, sent `command(time)` at every tick."""
    sim = SimulatedRig(rig, abilities_of(rig))
    times, strain, pressure = [0.0], [float(sim.strain[0])], [float(sim.pressure_kPa[0])]
    for number in range(round(until / tick)):
        sim.step(tick, np.full(len(rig.fibers), command(number * tick)))
        times.append((number + 1) * tick)
        strain.append(float(sim.strain[0]))
        pressure.append(float(sim.pressure_kPa[0]))
    return np.array(times), np.array(strain), np.array(pressure)


def in_turn(sequence):
    """The command in force at a time, up to rounding of the ticks."""
    return lambda time: [share for begins, share in sequence if begins <= time + 1e-9][-1]


def stiff_run(fiber, sequence, limit, supply, times, delay):
    """Pressure and strain at `times` by the full equations, each set-point in force `delay` after it was sent."""
    P, e, s = 0.0, 0.0, 0.0
    strain, pressure = np.zeros(len(times)), np.zeros(len(times))
    edges = [begins + delay for begins, _ in sequence] + [times[-1] + 1.0]
    for (begin, end), (_, share) in zip(pairwise(edges), sequence, strict=True):
        goal = min(share * limit, supply)
        inside = (times >= begin) & (times < end)
        at = np.unique(np.concatenate([[begin], times[inside], [min(end, times[-1])]]))
        if abs(goal - P) > 1.5:
            all_P, all_e, all_s = stiff.journey(fiber, P, e, goal, supply, at, s)
        else:
            all_P, all_e = np.full(len(at), P), np.full(len(at), e)
            all_s = e + (s - e) * np.exp(-(at - begin) / fiber.settle)
        strain[inside] = np.interp(times[inside], at, all_s)
        pressure[inside] = np.interp(times[inside], at, all_P)
        P, e, s = all_P[-1], all_e[-1], all_s[-1]
    return pressure / 1e3, strain


CASES = {"cord": ("contractile", CORD, 1.5, 450.0), "pleat": ("extensile", PLEAT, 0.5, 400.0)}


@pytest.mark.parametrize("rate_Hz", [100, 200, 500, 2000])
@pytest.mark.parametrize("name", CASES)
def test_strain_is_within_a_hundredth_of_stroke_of_the_full_equations_at_any_tick(name, rate_Hz):
    kind, make, load, limit = CASES[name]
    rig = rig_for(kind, make, load)
    stroke = abilities_of(rig).stroke[0]
    times, strain, pressure = run(rig, 1.0 / rate_Hz, 7.0, in_turn(SEQUENCE))
    expected_kPa, expected = stiff_run(stiff_fiber(make, mounted(load_N=load)), SEQUENCE, limit * 1e3, 400e3, times, 0.011)
    assert np.max(np.abs(strain - expected)) < 0.01 * stroke
    assert np.max(np.abs(pressure - expected_kPa)) < 0.01 * 400.0


@pytest.mark.parametrize("kind", EACH)
def test_the_tick_makes_next_to_no_difference(kind):
    rig = rig_for(kind, EACH[kind], 0.3)
    stroke = abilities_of(rig).stroke[0]
    coarse, fine = (run(rig, 1.0 / rate, 7.0, in_turn(SEQUENCE))[1] for rate in (100, 2000))
    assert np.max(np.abs(coarse - fine[::20])) < 0.003 * stroke


@settings(max_examples=40, deadline=None)
@given(
    kind=st.sampled_from(list(EACH)),
    drive=st.sampled_from(["pressure", "strain", "valve"]),
    C=st.sampled_from([0.0005, 0.05, 50.0]),
    tick=st.sampled_from([0.0005, 0.0033, 0.01, 0.1]),
    sent=st.lists(st.floats(-2.0, 2.0), min_size=1, max_size=40),
    medium=st.sampled_from(["air", "water"]),
)
def test_whatever_is_sent_strain_and_pressure_stay_where_they_can_be(kind, drive, C, tick, sent, medium):
    rig = rig_for(kind, EACH[kind], 0.3, drive=drive, C=C, medium=medium)
    abilities = abilities_of(rig)
    sim = SimulatedRig(rig, abilities)
    physics = abilities.capabilities[0].physics
    for command in sent:
        sim.step(tick, [command])
        assert 0.0 <= sim.strain[0] <= physics.stop * (1.0 + 1e-9)
        assert -1e-9 <= sim.pressure_kPa[0] <= 400.0 * (1.0 + 1e-9)
        assert np.isfinite(sim.supply_kPa)


@pytest.mark.parametrize("medium", ["air", "water"])
@pytest.mark.parametrize("kind", EACH)
def test_a_strain_drive_brings_a_fiber_to_the_strain_asked_for_from_below_and_from_above(kind, medium):
    rig = rig_for(kind, EACH[kind], 0.3, drive="strain", C=0.02, medium=medium)
    stroke = abilities_of(rig).stroke[0]
    strain = run(rig, 0.002, 8.0, in_turn(((0.0, 0.6), (4.0, 0.3))))[1]
    assert strain[2000] == pytest.approx(0.6 * stroke, abs=0.002 * stroke)
    assert strain[-1] == pytest.approx(0.3 * stroke, abs=0.002 * stroke)


@pytest.mark.parametrize("medium", ["air", "water"])
@pytest.mark.parametrize("kind", EACH)
def test_a_shut_valve_holds_and_half_an_opening_is_slower(kind, medium):
    rig = rig_for(kind, EACH[kind], 0.3, drive="valve", medium=medium)
    _, full, _ = run(rig, 0.002, 0.4, in_turn(((0.0, 1.0),)))
    _, half, _ = run(rig, 0.002, 0.8, in_turn(((0.0, 0.5), (0.4, 0.0))))
    assert 0.0 < half[200] < full[200]
    assert half[-1] == pytest.approx(half[300], abs=1e-4)


@pytest.mark.parametrize("medium", ["air", "water"])
def test_a_small_reversal_of_pressure_moves_nothing(medium):
    rig = rig_for("contractile", CORD, medium=medium, C=0.05)
    times, strain, pressure = run(rig, 0.002, 3.0, in_turn(((0.0, 0.5), (1.5, 0.49))))
    before, after = times < 1.5, times > 2.5
    assert np.ptp(strain[after]) == pytest.approx(0.0, abs=1e-6)
    assert strain[-1] == pytest.approx(strain[before][-1], abs=1e-6)
    assert pressure[-1] == pytest.approx(0.49 * 450.0, rel=1e-3)


def test_filling_and_exhausting_take_different_curves():
    rig = rig_for("contractile", CORD, C=0.05)
    up = run(rig, 0.002, 3.0, in_turn(((0.0, 0.5),)))[1][-1]
    down = run(rig, 0.002, 5.0, in_turn(((0.0, 1.0), (2.0, 0.5))))[1][-1]
    assert down > 1.02 * up


def test_a_fiber_answers_after_its_valve_and_its_tube():
    rig = rig_for("contractile", CORD, load_N=0.01, C=0.5)
    times, _, pressure = run(rig, 0.0005, 0.05, lambda time: 1.0)
    # 8 ms of valve, 0.8 m of tube and half the fiber at the speed of sound.
    assert times[np.argmax(pressure > 0.0)] == pytest.approx(0.008 + 0.003, abs=0.0011)


def test_a_far_fiber_comes_after_a_near_one():
    near = rig_for("contractile", CORD, C=0.05)
    far = read_rig(
        rig_of("contractile", CORD, "load_N = 1.5\ntube_bore_mm = 1.0\ntube_length_mm = 4000", C=0.05), "bench.rig.toml"
    )
    at_near, at_far = (run(rig, 0.002, 0.3, lambda time: 1.0)[1][-1] for rig in (near, far))
    assert at_far < 0.9 * at_near


def test_air_drawn_by_a_stroke_is_that_of_the_table():
    rig = rig_for("contractile", CORD)
    abilities = abilities_of(rig)
    sim = SimulatedRig(rig, abilities)
    for _ in range(2000):
        sim.step(0.005, [380.0 / 450.0])
    assert sim.strain[0] == pytest.approx(abilities.stroke[0], rel=1e-3)
    assert sim.drawn_L == pytest.approx(abilities.air_L[0, -1], rel=0.01)


def test_water_drawn_by_a_stroke_is_the_volume_that_it_adds():
    rig = rig_for("contractile", CORD, medium="water")
    abilities = abilities_of(rig)
    sim = SimulatedRig(rig, abilities)
    for _ in range(4000):
        sim.step(0.005, [380.0 / 450.0])
    assert sim.strain[0] == pytest.approx(abilities.stroke[0], rel=1e-3)
    assert sim.drawn_L == pytest.approx(abilities.air_L[0, -1], rel=1e-3)


@pytest.mark.parametrize("way", ["fill", "exhaust"])
def test_water_moves_a_fiber_at_the_rates_of_its_table(way):
    rig = rig_for("contractile", CORD, medium="water")
    able = abilities_of(rig).capabilities[0]
    sequence = ((0.0, 1.0),) if way == "fill" else ((0.0, 1.0), (20.0, 0.0))
    times, strain, _ = run(rig, 0.005, 20.0 if way == "fill" else 40.0, in_turn(sequence))
    e = np.linspace(0.1, 0.9, 2001) * able.stroke
    expected = np.trapezoid(1.0 / np.interp(e, able.strain, getattr(able, way)), e)
    if way == "fill":
        took = np.interp(e[-1], strain, times) - np.interp(e[0], strain, times)
    else:
        back, at = -strain[times >= 20.0], times[times >= 20.0]
        took = np.interp(-e[0], back, at) - np.interp(-e[-1], back, at)
    assert took == pytest.approx(expected, rel=0.02)


def test_a_rig_may_have_rated_and_modelled_fibers_together():
    text = rig_of("contractile", CORD, count=2) + (
        '\n[fiber_type.drop]\nkind = "rated"\ndirection = "contract"\nrest_length_mm = 400\nstroke = 0.3\n'
        'fill_rate_per_s = 0.6\nexhaust_rate_per_s = 0.3\nair_mL = 3\n\n[[fiber]]\nname = "drop"\ntype = "drop"\nchannel = 2\n'
    )
    rig = read_rig(text, "bench.rig.toml")
    sim = SimulatedRig(rig, abilities_of(rig))
    for _ in range(100):
        sim.step(0.002, np.full(3, 0.8))
    assert sim.strain[0] == sim.strain[1] > 0.0
    assert sim.strain[2] == pytest.approx(0.6 * (0.2 - 0.008))
    assert np.isnan(sim.pressure_kPa).tolist() == [False, False, True]


def test_many_fibers_on_a_small_receiver_come_later_than_few():
    few, many = (
        read_rig(
            rig_of("contractile", CORD, count=count, C=0.05)
            .replace("receiver_L = 10", "receiver_L = 0.1")
            .replace("_min = 40", "_min = 1"),
            "bench.rig.toml",
        )
        for count in (1, 48)
    )
    at = [run(rig, 0.002, 1.0, lambda time: 1.0)[1][-1] for rig in (few, many)]
    assert at[1] < 0.8 * at[0]


def test_reset_to_a_strain_is_a_fiber_blown_up_to_it_and_settled():
    rig = rig_for("contractile", CORD)
    sim = SimulatedRig(rig, abilities_of(rig))
    sim.reset([0.1])
    holds = stiff_fiber(CORD, mounted())
    assert sim.strain[0] == 0.1
    assert sim.pressure_kPa[0] == pytest.approx(np.interp(0.1, holds.e, holds.holds("in")) / 1e3, rel=1e-3)


def test_long_ticks_are_cut_into_equal_parts():
    assert [parts_of(dt) for dt in (0.0005, LONGEST_S, 0.005, 0.01, 0.0051)] == [1, 1, 2, 4, 3]


def test_the_lag_is_exact_for_a_straight_way():
    tau, h, rate = 0.015, 0.01, 2.0
    # ds/dt = (rate t - s) / tau from 0: s = rate (t - tau (1 - exp(-t / tau))).
    expected = rate * (h - tau * (1.0 - np.exp(-h / tau)))
    found = settled(np.array([tau, 0.0]), np.zeros(2), np.zeros(2), np.full(2, rate * h), h)
    assert found == pytest.approx([expected, rate * h])
