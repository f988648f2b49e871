"""The simulated rig as a whole."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.simulate.rig import SimulatedRig


def simulated(rig):
    return SimulatedRig(rig, abilities_of(rig))


def play(rig, tick, seconds, wanted):
    """Strain (F, ticks + 1) of a rig sent `wanted(time)` every tick."""
    sim = simulated(rig)
    seen = [sim.strain]
    for number in range(round(seconds / tick)):
        sim.step(tick, wanted(number * tick))
        seen.append(sim.strain)
    return np.array(seen).T, sim


@settings(deadline=None, max_examples=60)
@given(
    sent=st.lists(st.lists(st.floats(-2.0, 2.0), min_size=3, max_size=3), min_size=1, max_size=40),
    tick=st.sampled_from([0.0005, 0.002, 0.0033, 0.01]),
    drive=st.sampled_from(["pressure", "strain", "valve"]),
)
def test_no_fiber_is_ever_faster_than_its_rates_nor_outside_its_stroke(make_rig, sent, tick, drive):
    sim = simulated(make_rig(3, drive=drive))
    for command in sent:
        was = sim.strain
        sim.step(tick, command)
        assert np.all(sim.strain - was <= 0.6 * tick + 1e-12)
        assert np.all(was - sim.strain <= 0.3 * tick + 1e-12)
        assert np.all((sim.strain >= 0.0) & (sim.strain <= 0.3))


def test_a_fiber_fills_from_rest_at_its_fill_rate_once_the_valve_has_answered(make_rig):
    strain, _ = play(make_rig(1), 0.001, 1.0, lambda time: [1.0])
    time = np.arange(1001) * 0.001
    assert strain[0] == pytest.approx(np.clip((time - 0.008) * 0.6, 0.0, 0.3), abs=1e-9)


@pytest.mark.parametrize("tick", [0.0005, 0.003, 0.005, 0.01])
def test_the_valves_answer_comes_at_its_instant_whatever_the_tick(make_rig, tick):
    count = round(0.03 / tick)
    strain, _ = play(make_rig(1), tick, 0.03, lambda time: [1.0])
    assert strain[0, count] == pytest.approx((count * tick - 0.008) * 0.6, abs=1e-12)


@pytest.mark.parametrize("drive", ["pressure", "valve"])
def test_the_tick_makes_no_difference_to_where_fibers_are(make_rig, drive):
    rig = make_rig(2, drive=drive)
    swing = (
        (lambda time: [0.0, 1.0] if int(time * 5 + 1e-9) % 2 else [0.8, 0.3])
        if drive == "pressure"
        else (lambda time: [-0.5, 1.0] if int(time * 5 + 1e-9) % 2 else [0.8, -0.2])
    )
    coarse, _ = play(rig, 0.01, 2.0, swing)
    fine, _ = play(rig, 0.0005, 2.0, swing)
    assert coarse == pytest.approx(fine[:, ::20], abs=1e-9)


def test_a_valve_half_open_fills_at_half_the_rate_and_a_shut_one_holds(make_rig):
    strain, _ = play(make_rig(2, drive="valve"), 0.002, 0.4, lambda time: [0.5, 0.0])
    assert strain[:, -1] == pytest.approx([0.392 * 0.3, 0.0])


def test_the_air_balance_closes_when_the_supply_is_ample_and_when_it_is_short(make_rig):
    for receiver_L in (10.0, 0.2, 0.01):
        rig = make_rig(16, receiver_L=receiver_L, compressor_L_min=0.5, min_pressure_kPa=400.0)
        _, sim = play(rig, 0.005, 6.0, lambda time: np.full(16, float(int(time) % 2)))
        store = receiver_L / 100.0
        assert sim.drawn_L > 0.03
        assert sim.supply_kPa * store == pytest.approx(800.0 * store + sim.delivered_L - sim.drawn_L, rel=1e-12)


def test_air_drawn_is_that_of_the_strokes_filled(make_rig):
    _, sim = play(make_rig(4), 0.005, 4.0, lambda time: np.full(4, 1.0 if int(time) % 2 == 0 else 0.0))
    # 3 mL a stroke; from 1.008 s to 2.008 s it comes down 0.3, all the way.
    assert sim.drawn_L == pytest.approx(4 * 2 * 0.003)


def test_filling_slows_in_proportion_when_the_receiver_runs_below_what_the_regulator_needs(make_rig):
    rig = make_rig(40, receiver_L=0.05, compressor_L_min=0.0, min_pressure_kPa=400.0, max_receiver_kPa=400.0, air_mL=6.0)
    strain, sim = play(rig, 0.01, 5.0, lambda time: np.ones(40))
    # dP/dt = -(fill / stroke) air / V * P / needed: an exponential until the strokes are done, here never.
    speed = 40 * 0.006 * (0.6 / 0.3) * 100.0 / 0.05 / 400.0
    time = 0.1
    expected = 400.0 * np.exp(-speed * (time - 0.008))
    short = simulated(rig)
    for _ in range(200):
        short.step(0.0005, np.ones(40))
    assert short.supply_kPa == pytest.approx(expected, rel=0.01)
    assert short.strain == pytest.approx(np.full(40, (400.0 - short.supply_kPa) * 0.05 / 100 / 40 / 0.006 * 0.3))
    assert 0.0 <= sim.supply_kPa < 1.0
    assert strain[:, -1].max() < 0.3


@pytest.mark.parametrize("tick", [0.01, 0.0005])
def test_a_short_supply_comes_out_nearly_alike_at_every_tick(make_rig, tick):
    rig = make_rig(40, receiver_L=0.3, compressor_L_min=2.0, min_pressure_kPa=400.0, max_receiver_kPa=450.0)
    coarse, sim = play(rig, tick, 1.0, lambda time: np.ones(40))
    fine, other = play(rig, 0.00025, 1.0, lambda time: np.ones(40))
    assert coarse[:, -1] == pytest.approx(fine[:, -1], abs=0.003)
    assert sim.supply_kPa == pytest.approx(other.supply_kPa, abs=4.0)


def test_the_compressor_stops_at_the_cut_out(make_rig):
    _, sim = play(make_rig(2), 0.01, 5.0, lambda time: np.full(2, float(time < 1.0)))
    assert sim.supply_kPa == 800.0
    assert sim.delivered_L == pytest.approx(sim.drawn_L)


def test_reset_brings_everything_back_to_the_start(make_rig):
    rig = make_rig(2)
    _, sim = play(rig, 0.005, 0.5, lambda time: [1.0, 0.5])
    sim.reset()
    assert (sim.strain.tolist(), sim.supply_kPa, sim.drawn_L) == ([0.0, 0.0], 800.0, 0.0)
    sim.step(0.005, [0.0, 0.0])
    assert sim.strain.tolist() == [0.0, 0.0]
    assert np.isnan(sim.pressure_kPa).all()


@settings(deadline=None, max_examples=40)
@given(
    receiver_L=st.floats(0.001, 1.0),
    compressor_L_min=st.floats(0.0, 200.0),
    sent=st.lists(st.floats(0.0, 1.0), min_size=1, max_size=30),
    tick=st.sampled_from([0.0005, 0.01]),
)
def test_a_receiver_of_any_size_is_never_below_empty_nor_above_the_cut_out_and_its_air_is_accounted_for(
    make_rig, receiver_L, compressor_L_min, sent, tick
):
    sim = simulated(make_rig(8, receiver_L=receiver_L, compressor_L_min=compressor_L_min, air_mL=20.0))
    for share in sent:
        sim.step(tick, np.full(8, share))
        assert -1e-9 <= sim.supply_kPa <= 800.0 + 1e-9
    stored = receiver_L / 100.0 * (800.0 - sim.supply_kPa)
    assert stored == pytest.approx(sim.drawn_L - sim.delivered_L, abs=1e-9)
