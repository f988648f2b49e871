import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.fiber.extensile import Extensile
from composer.fiber.work import filling_pressure, reach

from .makes import PLEAT


@given(st.floats(0.0, 5.0), st.floats(1.0, 1000.0), st.floats(0.05, 2.9))
def test_without_a_load_pressure_on_the_bore_holds_the_stretched_wall(e, G_kPa, wall_mm):
    shape = replace(PLEAT, shear_modulus_kPa=G_kPa, wall_mm=wall_mm, sleeve_limit=10.0).shape()
    stretch = 1.0 + e
    held = shape.wall / shape.length * G_kPa * 1e3 * (stretch - stretch**-3)
    area = math.pi * shape.radius**2
    assert filling_pressure(shape, np.array(e), 0.0, 0.0) * area == pytest.approx(held, rel=1e-9, abs=1e-12)


def test_a_wall_as_large_as_the_area_it_is_blown_on_extends_as_bellows_of_the_trade_do(outside):
    # With the wall's area equal to the one that the pressure acts on, 350 kPa on G = 100 kPa: l - l^-3 = 3.5.
    whole = Extensile(
        rest_length_mm=100.0,
        outer_diameter_mm=6.0,
        wall_mm=2.999999,
        shear_modulus_kPa=100.0,
        max_pressure_kPa=350.0,
        sleeve_limit=5.0,
    )
    e = reach(whole.shape(), 350e3, 0.0, 0.0)
    assert e == pytest.approx(outside["fibers_of_the_trade"]["extension"], abs=0.1)
    stretch = 1.0 + e
    assert stretch - stretch**-3 == pytest.approx(3.5, rel=1e-6)


def test_the_sleeve_ends_the_motion():
    assert reach(replace(PLEAT, sleeve_limit=0.5).shape(), 400e3, 0.0, 0.04) == 0.5


def test_the_radius_is_held_so_volume_goes_with_length():
    shape = PLEAT.shape()
    e = np.linspace(0.0, 2.6, 7)
    assert shape.volume(e) == pytest.approx(math.pi * 3e-3**2 * 0.1 * (1.0 + e))
