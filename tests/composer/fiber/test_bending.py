import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.fiber.bending import Bending
from composer.fiber.modelled import capability

from .makes import FOLD, PLEAT, mounted


@given(st.floats(0.01, 0.2), st.floats(5.0, 80.0))
def test_the_thread_keeps_its_length_on_the_inside_of_the_bend(strain, held_mm):
    fold = Bending(base=PLEAT, constraint_length_mm=held_mm)
    theta = math.radians(fold.turn_deg() * strain)
    # The centre line is an arc of the stretched length, the thread the arc one radius further in.
    radius_of_bend = held_mm * (1.0 + strain) / theta
    assert theta * (radius_of_bend - PLEAT.radius_mm) == pytest.approx(held_mm, rel=1e-9)


def test_a_full_turn_ends_the_motion():
    assert FOLD.stop() * FOLD.turn_deg() == pytest.approx(360.0)
    assert replace(FOLD, constraint_length_mm=5.0).stop() == PLEAT.sleeve_limit


def test_the_fiber_itself_bends_by_the_degrees_of_its_stroke():
    able = capability(FOLD, mounted(load_N=0.0))
    assert able.turn_deg * able.stroke == pytest.approx(360.0)
    assert np.all(able.fill > 0.0)


def test_a_thread_longer_than_its_fiber_cannot_be():
    [(key, found, expected)] = replace(FOLD, constraint_length_mm=101.0).problems()
    assert (key, found, expected) == ("constraint_length_mm", "a thread holds 101 mm of a fiber of 100 mm", "at most 100 mm")
