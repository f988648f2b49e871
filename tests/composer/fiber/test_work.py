from itertools import pairwise

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from composer.fiber.work import exhausting_pressure, filling_pressure, ideal_force, reach

from .makes import CORD, PLEAT, straight

shares = st.floats(0.02, 0.95)


@settings(max_examples=200)
@given(straight, shares)
def test_slopes_are_the_derivatives_of_volume_and_energy(make, share):
    assume(not make.problems())
    shape = make.shape()
    assume(shape.stop > 1e-3)
    e, h = share * shape.stop, 1e-5 * shape.stop
    # Over a distance h a difference can't be told better than rounding of the values allows.
    for value, slope in ((shape.volume, shape.volume_slope), (shape.energy, shape.energy_slope)):
        rounding = 1e-15 * (abs(float(value(e))) + shape.wall * make.shear_modulus_kPa * 1e3 * (value == shape.energy)) / h
        found = (float(value(e + h)) - float(value(e - h))) / (2.0 * h)
        assert float(slope(np.array(e))) == pytest.approx(found, rel=1e-5, abs=20.0 * rounding + 1e-300)


@given(straight)
def test_at_rest_the_elastomer_is_at_rest(make):
    assume(not make.problems())
    shape = make.shape()
    assert float(shape.energy(np.array(0.0))) == pytest.approx(0.0, abs=1e-12 * shape.wall * make.shear_modulus_kPa * 1e3)
    assert float(shape.energy_slope(np.array(0.0))) == pytest.approx(
        0.0,
        abs=1e-11 * shape.wall * make.shear_modulus_kPa * 1e3 / np.tan(np.radians(getattr(make, "braid_angle_deg", 45.0))) ** 2,
    )


@settings(max_examples=200)
@given(straight, st.floats(0.0, 100.0), st.floats(0.0, 0.5))
def test_the_pressure_that_holds_a_strain_rises_with_it(make, load, friction):
    assume(not make.problems())
    shape = make.shape()
    assume(shape.stop > 1e-3)
    e = np.linspace(0.0, 0.999 * shape.stop, 200)
    holds = filling_pressure(shape, e, load, friction)
    assert np.all(np.diff(holds) >= -1e-9 * np.abs(holds[1:]) - 1e-6)
    assert np.all(exhausting_pressure(shape, e, load, friction) <= holds)


def cycle(shape, load, friction, turns):
    """A path of pressures through strains, the work of the gas on it, and where that work has gone.

    A strain that turns back stays until pressure has crossed the friction band, where no work is done.
    """
    gas = lifted = stored = rubbed = 0.0
    for begin, end in pairwise(turns):
        e = np.linspace(begin, end, 2001)
        middle, step = (e[1:] + e[:-1]) / 2.0, np.diff(e)
        holds = filling_pressure if end > begin else exhausting_pressure
        pressure = holds(shape, middle, load, friction)
        gas += np.sum(pressure * shape.volume_slope(middle) * step)
        lifted += load * shape.length * (end - begin)
        stored += float(shape.energy(np.array(end)) - shape.energy(np.array(begin)))
        rubbed += np.sum(friction * pressure * shape.volume_slope(middle) * np.abs(step))
    return gas, lifted, stored, rubbed


@settings(max_examples=100)
@given(
    st.sampled_from([CORD, PLEAT]),
    st.floats(0.0, 20.0),
    st.floats(0.0, 0.4),
    st.lists(st.floats(0.0, 0.9), min_size=2, max_size=8),
)
def test_the_work_of_the_gas_is_in_load_elastomer_and_friction_over_any_path(make, load, friction, turns):
    shape = make.shape()
    gas, lifted, stored, rubbed = cycle(shape, load, friction, [turn * shape.stop for turn in turns])
    size = shape.wall * make.shear_modulus_kPa * 1e3 + load * shape.length
    assert gas == pytest.approx(lifted + stored + rubbed, rel=1e-5, abs=1e-6 * size)


@settings(max_examples=100)
@given(
    st.sampled_from([CORD, PLEAT]),
    st.floats(0.0, 20.0),
    st.floats(0.0, 0.4),
    st.lists(st.floats(0.0, 0.9), min_size=2, max_size=8),
)
def test_over_a_closed_cycle_all_the_work_of_the_gas_is_friction(make, load, friction, turns):
    shape = make.shape()
    strains = [turn * shape.stop for turn in turns]
    gas, lifted, stored, rubbed = cycle(shape, load, friction, [*strains, strains[0]])
    size = shape.wall * make.shear_modulus_kPa * 1e3 + load * shape.length
    assert lifted == pytest.approx(0.0, abs=1e-9 * size)
    assert stored == pytest.approx(0.0, abs=1e-9 * size)
    assert gas == pytest.approx(rubbed, rel=1e-5, abs=1e-6 * size)
    assert gas >= -1e-6 * size


@given(st.sampled_from([CORD, PLEAT]), st.floats(1e3, 5e5), st.floats(0.0, 3.0), st.floats(0.0, 0.3))
def test_reach_is_where_the_pressure_holds_the_strain(make, pressure, load, friction):
    shape = make.shape()
    e = reach(shape, pressure, load, friction)
    holds = filling_pressure(shape, np.array([e]), load, friction)[0]
    if e == 0.0:
        assert filling_pressure(shape, np.array([0.0]), load, friction)[0] >= pressure
    elif e == shape.stop:
        assert holds <= pressure
    else:
        assert holds == pytest.approx(pressure, rel=1e-9)


def test_the_ideal_force_at_the_pressure_that_holds_is_the_load():
    shape = CORD.shape()
    e = np.linspace(0.0, 0.25, 30)
    assert ideal_force(shape, e, filling_pressure(shape, e, 3.0, 0.0)) == pytest.approx(np.full(30, 3.0))
