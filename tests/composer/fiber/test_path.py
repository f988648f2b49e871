import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.fiber.orifice import mass_flow, orifice
from composer.fiber.path import Path, exhaust_flow, fill_flow, pressure_before
from composer.fiber.pipe import Pipe, isothermal_flow

MINI = orifice(0.005, 0.3)
WIDE = orifice(5.0, 0.3)


def test_without_a_tube_the_valve_alone_decides():
    path = Path(MINI, (Pipe(2e-3, 0.0),))
    fiber = np.linspace(1.1e5, 4.9e5, 20)
    assert fill_flow(path, 5e5, fiber) == pytest.approx(mass_flow(MINI, 5e5, fiber), rel=1e-9)
    assert exhaust_flow(path, fiber, 1.01325e5) == pytest.approx(mass_flow(MINI, fiber, 1.01325e5), rel=1e-9)


def test_with_a_wide_valve_the_tube_alone_decides():
    tube = Pipe(1e-3, 4.0)
    path = Path(WIDE, (tube,))
    fiber = np.linspace(1.1e5, 4.9e5, 20)
    assert fill_flow(path, 5e5, fiber) == pytest.approx(isothermal_flow(tube, 5e5, fiber), rel=1e-3)
    assert exhaust_flow(path, fiber, 1.01325e5) == pytest.approx(isothermal_flow(tube, fiber, 1.01325e5), rel=2e-3)


@settings(max_examples=60)
@given(st.floats(0.5e-3, 8e-3), st.floats(0.01, 20.0), st.floats(1.1e5, 1.5e6), st.floats(0.1, 0.99))
def test_the_inlet_pressure_of_a_tube_is_the_one_that_drives_its_flow(bore, length, p1, share):
    pipe = Pipe(bore, length)
    p2 = share * p1
    flow = isothermal_flow(pipe, p1, p2)
    choked = flow >= isothermal_flow(pipe, p1, 0.0) * (1 - 1e-9)
    if not choked:
        assert pressure_before(pipe, flow, np.array(p2)) == pytest.approx(p1, rel=1e-4)


@settings(max_examples=60)
@given(st.floats(1e-3, 1.0), st.floats(0.3e-3, 8e-3), st.floats(0.0, 20.0), st.floats(1.2e5, 1.5e6), st.floats(0.0, 1.0))
def test_more_in_series_is_never_more_flow(C, bore, length, supply, share):
    valve, tube = orifice(C, 0.3), Pipe(bore, length)
    fiber = 101325.0 + share * (supply - 101325.0)
    one, two = Path(valve, (tube,)), Path(valve, (tube, Pipe(2e-3, 0.2)))
    for flow_of in (lambda path: fill_flow(path, supply, fiber), lambda path: exhaust_flow(path, fiber, 101325.0)):
        alone, further = float(flow_of(one)), float(flow_of(two))
        assert 0.0 <= further <= alone * (1 + 1e-9)
        assert np.isfinite(alone)


def test_flow_is_the_same_in_valve_and_tube():
    tube = Pipe(0.8e-3, 4.0)
    path = Path(MINI, (tube,))
    flow = fill_flow(path, 5e5, 2e5)
    middle = pressure_before(tube, flow, np.array(2e5))
    assert mass_flow(MINI, 5e5, middle) == pytest.approx(flow, rel=1e-9)


def test_nothing_flows_backwards():
    path = Path(MINI, (Pipe(2e-3, 1.0),))
    assert fill_flow(path, 2e5, 3e5) == 0.0
    assert exhaust_flow(path, 1e5, 1.01325e5) == 0.0


def test_delay_and_dead_volume_are_those_of_the_tubes(outside):
    path = Path(MINI, (Pipe(2e-3, 3.0), Pipe(2e-3, 0.4)))
    assert path.delay == pytest.approx(3.4 / outside["air_20C"]["speed_of_sound"], rel=1e-3)
    # The second is the fiber's own bore, which the fiber counts.
    assert path.dead_volume == pytest.approx(np.pi * 1e-6 * 3.0)
