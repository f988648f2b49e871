import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.fiber.coiling import Coiling, Helix

from .makes import PLEAT, TENDRIL


def curve_of(curvature: float, torsion: float, turns: float = 2.0, points: int = 20001):
    """Points of the curve with this curvature and torsion, by the formulas of Frenet and Serret, stepped along it."""
    w = math.hypot(curvature, torsion)
    s = np.linspace(0.0, 2.0 * math.pi * turns / w, points)
    h = s[1] - s[0]
    # Over a step the frame turns as a rigid body about the Darboux vector, here in the frame's own axes.
    axis = np.array([torsion, 0.0, curvature]) / w
    cross = np.array([[0, -axis[2], axis[1]], [axis[2], 0, -axis[0]], [-axis[1], axis[0], 0]])
    turn = np.eye(3) + math.sin(w * h) * cross + (1.0 - math.cos(w * h)) * cross @ cross
    half = np.eye(3) + math.sin(w * h / 2) * cross + (1.0 - math.cos(w * h / 2)) * cross @ cross
    frame, at, points_ = np.eye(3), np.zeros(3), [np.zeros(3)]
    for _ in s[1:]:
        at = at + h * (frame @ half)[:, 0]
        frame = frame @ turn
        points_.append(at)
    return np.array(points_), axis


@settings(max_examples=10, deadline=None)
@given(st.floats(5.0, 300.0), st.floats(1.0, 300.0))
def test_radius_and_rise_are_those_of_the_curve_itself(curvature, torsion):
    points, axis = curve_of(curvature, torsion)
    helix = Helix(curvature, torsion)
    along = points @ axis
    per_turn = (len(points) - 1) // 2
    assert along[per_turn] - along[0] == pytest.approx(helix.rise, rel=1e-5)
    across = points - np.outer(along, axis)
    turn = across[:per_turn]
    centre = turn.mean(axis=0)
    assert np.linalg.norm(turn - centre, axis=1) == pytest.approx(np.full(per_turn, helix.radius), rel=1e-3)


@given(st.floats(0.01, 2.0))
def test_curvature_and_torsion_share_the_turn_by_the_winding_of_the_thread(strain):
    helix = TENDRIL.helix(strain)
    per_m = math.radians(TENDRIL.turn_deg()) * strain / (TENDRIL.constraint_length_mm * 1e-3)
    assert helix.torsion / helix.curvature == pytest.approx(2.0 * math.pi * PLEAT.radius_mm / TENDRIL.constraint_pitch_mm)
    assert math.hypot(helix.curvature, helix.torsion) == pytest.approx(
        per_m * math.cos(math.atan2(2.0 * math.pi * PLEAT.radius_mm, TENDRIL.constraint_pitch_mm))
    )


def test_a_thread_that_winds_ever_more_slowly_bends_only():
    slow = Coiling(base=PLEAT, constraint_length_mm=80.0, constraint_pitch_mm=1e5)
    assert slow.helix(0.3).torsion == pytest.approx(0.0, abs=0.1)
    assert slow.helix(0.3).curvature == pytest.approx(0.3 / 3e-3, rel=1e-6)
    assert slow.helix(0.3).radius == pytest.approx(3e-3 / 0.3, rel=1e-3)


def test_at_rest_there_is_no_curvature():
    helix = TENDRIL.helix(0.0)
    assert (helix.curvature, helix.radius, helix.rise) == (0.0, math.inf, math.inf)


def test_a_coil_goes_on_beyond_a_full_turn():
    assert TENDRIL.stop() == PLEAT.sleeve_limit
    assert TENDRIL.turn_deg() * TENDRIL.stop() > 360.0


def test_a_thread_longer_than_its_fiber_cannot_be():
    assert [key for key, _, _ in replace(TENDRIL, constraint_length_mm=101.0).problems()] == ["constraint_length_mm"]
