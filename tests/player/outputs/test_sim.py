"""The simulated rig as an output."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from player.outputs.sim import Sim


@pytest.fixture
def sim(make_rig):
    rig = make_rig(2)
    output = Sim(rig, abilities_of(rig), ("main",))
    output.arm()
    return output


def test_a_set_is_held_until_the_next_is_due(sim):
    sim.send(1.0, np.ones(2))
    sim.send(1.208, np.ones(2))
    event, supply = sim.poll()
    # 8 ms for the valve, then 0.2 s at a strain rate of 0.6.
    assert event.kind == "sense" and event.time_s == 1.208
    assert event.strain == pytest.approx([0.12, 0.12])
    assert supply.kind == "supply" and supply.driver == "main"


def test_events_are_told_once(sim):
    sim.send(0.0, np.zeros(2))
    sim.send(0.1, np.zeros(2))
    assert len(sim.poll()) == 2 and sim.poll() == []


@pytest.mark.parametrize("end", ["rest", "vent"])
def test_after_rest_and_after_a_vent_no_strain_is_left(sim, end):
    sim.send(0.0, np.ones(2))
    sim.send(0.5, np.ones(2))
    sim.rest(0.0) if end == "rest" else sim.vent()
    assert sim.counters()["strain_left"] < 1e-4


def test_fibers_of_other_drivers_are_left_alone(make_rig):
    rig = make_rig(4, boards=2)
    output = Sim(rig, abilities_of(rig), ("board2",))
    output.arm()
    output.send(0.0, np.ones(4))
    output.send(1.0, np.ones(4))
    event, _ = output.poll()
    assert event.fibers.tolist() == [2, 3] and np.all(event.strain == 0.3)
    assert np.all(output._sim.strain[:2] == 0.0)


def test_the_receiver_is_told_of_ten_times_a_second_as_it_is(make_rig):
    rig = make_rig(4, receiver_L=0.1, compressor_L_min=0.0, air_mL=100.0)
    output = Sim(rig, abilities_of(rig), ("main",))
    output.arm()
    kPa = []
    for tick in range(201):
        output.send(tick * 0.005, np.ones(4))
        kPa += [event.kPa for event in output.poll() if event.kind == "supply"]
    assert len(kPa) == 10
    assert kPa == sorted(kPa, reverse=True) and kPa[-1] < kPa[0]
    assert output.counters()["lowest_supply_kPa"] == pytest.approx(kPa[-1], rel=0.05)


def test_the_lowest_supply_is_counted(make_rig):
    rig = make_rig(4, receiver_L=0.1, compressor_L_min=0.0, air_mL=100.0)
    output = Sim(rig, abilities_of(rig), ("main",))
    output.arm()
    output.send(0.0, np.ones(4))
    output.send(1.0, np.ones(4))
    assert output.counters()["lowest_supply_kPa"] < 500.0
