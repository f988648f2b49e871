import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.fiber.contractile import Contractile
from composer.fiber.work import ideal_force, reach

from .makes import CORD

angles, pressures = st.floats(5.0, 50.0), st.floats(1e3, 1e6)


def ideal(angle_deg: float, k: float = 1.0) -> Contractile:
    """A braid whose elastomer costs nothing."""
    return replace(CORD, shear_modulus_kPa=0.0, braid_angle_deg=angle_deg, end_factor=k)


@given(angles, pressures, st.floats(0.0, 0.999))
def test_without_elastomer_the_force_is_that_of_gaylord_and_of_chou_and_hannaford(angle, pressure, share):
    shape = ideal(angle).shape()
    e = share * shape.stop
    cos_a = (1.0 - e) * math.cos(math.radians(angle))
    # The diameter at 90°: where the thread, b long over n turns, goes round in one plane.
    d90 = 2.0 * shape.radius / math.sin(math.radians(angle))
    force = math.pi * d90**2 * pressure / 4.0 * (3.0 * cos_a**2 - 1.0)
    assert ideal_force(shape, np.array(e), np.array(pressure)) == pytest.approx(force, rel=1e-9, abs=1e-9 * pressure * d90**2)


@given(angles, pressures, st.floats(0.0, 0.999), st.floats(1.0, 2.0))
def test_with_an_end_factor_the_force_is_that_of_tondu_and_lopez(angle, pressure, share, k):
    shape = ideal(angle, k).shape()
    a0 = math.radians(angle)
    a, b = 3.0 / math.tan(a0) ** 2, 1.0 / math.sin(a0) ** 2
    e_max = (1.0 - math.sqrt(b / a)) / k
    assert shape.stop == pytest.approx(e_max, rel=1e-9)
    e = share * e_max
    force = math.pi * shape.radius**2 * pressure * (a * (1.0 - k * e) ** 2 - b)
    size = math.pi * shape.radius**2 * pressure * a
    assert ideal_force(shape, np.array(e), np.array(pressure)) == pytest.approx(force, rel=1e-9, abs=1e-9 * size)


@given(angles)
def test_a_braid_pulls_no_more_at_its_limit_angle(outside, angle):
    shape = ideal(angle).shape()
    stretch = 1.0 - shape.stop
    assert math.degrees(math.acos(stretch * math.cos(math.radians(angle)))) == pytest.approx(
        outside["braid"]["limit_angle_deg"], abs=5e-5
    )
    assert ideal_force(shape, np.array(shape.stop), np.array(4e5)) == pytest.approx(
        0.0, abs=1e-9 * float(ideal_force(shape, np.array(0.0), np.array(4e5)))
    )


def test_free_braids_contract_to_the_limit_angle(outside):
    for angle, contraction in outside["braid"]["free_contraction"].items():
        assert ideal(float(angle)).shape().stop == pytest.approx(contraction, abs=5e-5), angle


def test_a_fiber_of_22_degrees_with_usual_ends_contracts_as_fibers_of_the_trade_do(outside):
    assert ideal(22.0, 1.15).shape().stop == pytest.approx(outside["fibers_of_the_trade"]["contraction"], abs=0.015)


@given(st.floats(0.0, 0.999))
def test_the_energy_of_the_wall_is_that_of_a_neo_hookean_tube(share):
    shape = replace(CORD, end_factor=1.0).shape()
    e = share * shape.stop
    along = 1.0 - e
    around = math.sin(math.acos(along * math.cos(shape.angle))) / math.sin(shape.angle)
    through = 1.0 / (along * around)
    energy = shape.wall * shape.modulus / 2.0 * (along**2 + around**2 + through**2 - 3.0)
    assert shape.energy(np.array(e)) == pytest.approx(energy, rel=1e-9, abs=1e-15)


@given(st.floats(0.0, 1.0), st.floats(1.0, 2.0))
def test_the_volume_is_that_of_the_tube_within_the_braid(share, k):
    shape = replace(CORD, end_factor=k).shape()
    e = share * shape.stop
    length = shape.length * (1.0 - k * e)
    radius = shape.radius * math.sin(math.acos((1.0 - k * e) * math.cos(shape.angle))) / math.sin(shape.angle)
    rest = math.pi * shape.radius**2 * shape.length
    assert shape.volume(np.array(e)) == pytest.approx(rest + (math.pi * radius**2 * length - rest) / k, rel=1e-12)


def test_elastomer_keeps_a_fiber_short_of_what_the_ideal_braid_does():
    soft, stiff = (reach(replace(CORD, shear_modulus_kPa=G).shape(), 4e5, 1.5, 0.04) for G in (100.0, 1000.0))
    assert stiff < soft < ideal(22.0, 1.15).shape().stop


def test_strong_fibers_of_the_trade_are_within_reach(outside):
    thick = replace(CORD, outer_diameter_mm=6.0, wall_mm=1.0)
    assert ideal_force(thick.shape(), np.array(0.0), np.array(4e5)) > outside["fibers_of_the_trade"]["force_N"]
