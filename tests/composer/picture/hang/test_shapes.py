"""Lines of fibers in space against differential geometry."""

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.fiber.bending import Bending
from composer.fiber.coiling import Coiling
from composer.fiber.contractile import Contractile
from composer.fiber.extensile import Extensile
from composer.picture.hang.shapes import Hanging, bends, centre_lines, hanging_of, lengths, radii
from composer.rig.model import FiberType

TUBE = {
    "rest_length_mm": 300.0, "outer_diameter_mm": 6.0, "wall_mm": 1.0, "shear_modulus_kPa": 200.0, "max_pressure_kPa": 300.0,
}  # fmt: skip
SLEEVE = Extensile(**TUBE, sleeve_limit=0.9)
BRAID = Contractile(**TUBE, braid_angle_deg=22.0, end_factor=1.15)


@pytest.fixture(scope="module")
def hang(make_rig):
    """A maker of one fiber of a make, hung at `at_m` and running `toward`."""

    def make(kind, built, at_m=(0.0, 0.0, 2.0), toward=(0.0, 0.0, -1.0), series=1) -> Hanging:
        rig = make_rig(1)
        fiber = rig.fibers[0]
        mounting = replace(fiber.mounting, series=series)
        hung = replace(fiber, type=FiberType("x", kind, built, 1), at_m=at_m, toward=toward, mirror=None, mounting=mounting)
        return hanging_of(replace(rig, fibers=(hung,)))

    return make


def line(hanging, strain):
    return centre_lines(hanging, np.full(len(hanging.at), strain))


def finely(hanging, points=4001):
    """The same fiber with more points, evenly along it."""
    return replace(
        hanging,
        first=np.array([0, points]),
        of=np.zeros(points, dtype=np.int64),
        share=np.linspace(0.0, 1.0, points),
    )


def long(points):
    return float(np.linalg.norm(np.diff(points, axis=0), axis=1).sum())


def test_a_contracting_fiber_hangs_straight_and_its_end_rises_by_the_strain(hang):
    points = line(hang("contractile", BRAID), 0.2)
    assert points[0] == pytest.approx([0.0, 0.0, 2.0])
    assert points[-1] == pytest.approx([0.0, 0.0, 2.0 - 0.3 * 0.8])


def test_an_extending_fiber_grows_by_the_strain_along_its_way(hang):
    points = line(hang("extensile", SLEEVE, toward=(1.0, 0.0, 0.0)), 0.5)
    assert points[-1] == pytest.approx([0.45, 0.0, 2.0])


def test_a_series_is_as_long_as_all_its_fibers(hang):
    assert lengths(hang("contractile", BRAID, series=3), [0.1])[0] == pytest.approx(3 * 0.3 * 0.9)


def test_a_braid_shortened_to_its_neutral_angle_is_as_fat_as_the_outside_value(hang, outside):
    known = outside["braid_at_its_neutral_angle"]
    hanging = hang("contractile", replace(BRAID, braid_angle_deg=known["angle_deg"], end_factor=1.0))
    fatter = radii(hanging, [known["free_contraction"]])[0] / radii(hanging, [0.0])[0]
    assert fatter == pytest.approx(known["radius_ratio"], rel=1e-3)


def test_a_sleeve_holds_the_radius_of_an_extending_fiber(hang):
    assert radii(hang("extensile", SLEEVE), [0.7]) == pytest.approx([0.003])


def test_a_rated_fiber_is_drawn_as_if_it_kept_its_volume(make_rig):
    hanging = hanging_of(make_rig(1))
    rest, full = (radii(hanging, [e])[0] ** 2 * lengths(hanging, [e])[0] for e in (0.0, 0.25))
    assert full == pytest.approx(rest)


@pytest.mark.parametrize(("base", "sign"), [(SLEEVE, 1.0), (BRAID, -1.0)])
@given(strain=st.floats(1e-4, 0.09))
def test_a_bent_fiber_is_an_arc_that_turns_by_held_length_times_strain_over_radius(hang, base, sign, strain):
    make = Bending(base=base, constraint_length_mm=200.0)
    hanging = finely(hang("bending", make))
    held = 0.2 * (1.0 + sign * strain)
    points = line(hanging, strain)[: int(4001 * 200 / 300) - 1]
    theta = 0.2 * strain / 0.003
    assert make.turn_deg() * strain == pytest.approx(math.degrees(theta))
    # A chord of an arc of length s and radius R is 2 R sin(s / 2R).
    radius = held / theta
    gone = np.linspace(0.0, 1.0, 4001)[: len(points)] * 0.3 * (1.0 + sign * strain)
    chord = np.linalg.norm(points - points[0], axis=1)
    assert chord == pytest.approx(np.abs(2.0 * radius * np.sin(gone / (2.0 * radius))), abs=1e-9)


def test_the_thread_of_a_bent_fiber_keeps_its_length(hang):
    for base, inside in ((SLEEVE, -0.003), (BRAID, 0.003)):
        hanging = hang("bending", Bending(base=base, constraint_length_mm=300.0))
        curvature, _ = bends(hanging, [0.08])
        turn = curvature[0] * lengths(hanging, [0.08])[0]
        assert (1.0 / curvature[0] + inside) * turn == pytest.approx(0.3)


def test_a_bent_fiber_sets_out_along_its_way_and_goes_on_straight_beyond_the_thread(hang):
    hanging = finely(hang("bending", Bending(base=SLEEVE, constraint_length_mm=150.0)))
    points = line(hanging, 0.03)
    ways = np.diff(points, axis=0)
    ways /= np.linalg.norm(ways, axis=1)[:, None]
    assert ways[0] == pytest.approx([0.0, 0.0, -1.0], abs=1e-3)
    free = ways[2100:]
    assert free == pytest.approx(np.broadcast_to(free[0], free.shape), abs=1e-9)
    turn = math.acos(np.clip(ways[0] @ free[0], -1.0, 1.0))
    assert turn == pytest.approx(0.15 * 0.03 / 0.003, abs=1e-3)


@given(strain=st.floats(0.15, 0.85), pitch=st.floats(10.0, 400.0))
def test_a_coiling_fiber_is_a_helix_of_the_radius_and_rise_that_its_make_says(hang, strain, pitch):
    make = Coiling(base=SLEEVE, constraint_length_mm=300.0, constraint_pitch_mm=pitch)
    hanging = finely(hang("coiling", make), 20001)
    points = line(hanging, strain)
    helix = make.helix(strain)
    turns = lengths(hanging, [strain])[0] * math.hypot(helix.curvature, helix.torsion) / (2.0 * math.pi)
    # Half a turn apart, the mean of two points lies on the axis, half the rise apart.
    step = round(20000 / turns / 2.0)
    way = points[2 * step] - points[0]
    assert np.linalg.norm(way) == pytest.approx(helix.rise, rel=2e-3, abs=2e-6)
    axis = way / np.linalg.norm(way)
    across = (points[step] - points[0]) - ((points[step] - points[0]) @ axis) * axis
    assert np.linalg.norm(across) / 2.0 == pytest.approx(helix.radius, rel=5e-3)


def test_curvature_and_torsion_of_a_coil_as_drawn_are_those_of_frenet_and_serret(hang):
    make = Coiling(base=SLEEVE, constraint_length_mm=300.0, constraint_pitch_mm=50.0)
    hanging = finely(hang("coiling", make), 40001)
    points = line(hanging, 0.4)
    step = lengths(hanging, [0.4])[0] / 40000
    first = np.gradient(points, step, axis=0)
    second = np.gradient(first, step, axis=0)
    third = np.gradient(second, step, axis=0)
    middle = slice(100, -100)
    normal = np.cross(first, second)[middle]
    square = (normal**2).sum(axis=1)
    curvature = np.sqrt(square) / np.linalg.norm(first[middle], axis=1) ** 3
    torsion = (normal * third[middle]).sum(axis=1) / square
    helix = make.helix(0.4)
    assert np.median(curvature) == pytest.approx(helix.curvature, rel=1e-3)
    assert np.median(torsion) == pytest.approx(helix.torsion, rel=1e-2)


def test_a_coil_of_a_turn_and_more_has_its_axis_along_its_way(hang):
    make = Coiling(base=SLEEVE, constraint_length_mm=300.0, constraint_pitch_mm=60.0)
    hanging = finely(hang("coiling", make, toward=(0.6, 0.0, -0.8)), 20001)
    points = line(hanging, 0.5)
    helix = make.helix(0.5)
    step = round(20000 * 2.0 * math.pi / math.hypot(helix.curvature, helix.torsion) / lengths(hanging, [0.5])[0])
    way = points[step] - points[0]
    assert way / np.linalg.norm(way) == pytest.approx([0.6, 0.0, -0.8], abs=5e-3)


@pytest.mark.parametrize(
    ("kind", "make"),
    [
        ("contractile", BRAID),
        ("extensile", SLEEVE),
        ("bending", Bending(base=BRAID, constraint_length_mm=120.0)),
        ("coiling", Coiling(base=SLEEVE, constraint_length_mm=200.0, constraint_pitch_mm=60.0)),
    ],
)
@given(strain=st.floats(0.0, 0.2), x=st.floats(-1, 1), y=st.floats(-1, 1), z=st.floats(0.1, 1))
def test_no_line_is_longer_or_shorter_than_its_fiber_whichever_way_it_runs(hang, kind, make, strain, x, y, z):
    toward = np.array([x, y, z]) / math.sqrt(x * x + y * y + z * z)
    hanging = finely(hang(kind, make, toward=tuple(toward.tolist())), 8001)
    assert long(line(hanging, strain)) == pytest.approx(lengths(hanging, [strain])[0], rel=1e-4)


def test_lines_move_without_a_jump_from_rest_to_full(hang):
    make = Coiling(base=SLEEVE, constraint_length_mm=200.0, constraint_pitch_mm=60.0)
    hanging = hang("coiling", make)

    def farthest(steps):
        ends = np.array([line(hanging, strain)[-1] for strain in np.linspace(0.0, 0.8, steps + 1)])
        return np.linalg.norm(np.diff(ends, axis=0), axis=1).max()

    assert farthest(4000) == pytest.approx(2.0 * farthest(8000), rel=0.02)


def test_a_drawn_coil_has_enough_points_to_look_round(hang):
    make = Coiling(base=SLEEVE, constraint_length_mm=200.0, constraint_pitch_mm=60.0)
    hanging = hang("coiling", make)
    drawn, true = long(line(hanging, 0.6)), lengths(hanging, [0.6])[0]
    assert drawn == pytest.approx(true, rel=0.02)


def test_partners_in_the_mirror_bend_away_from_each_other(make_rig):
    rig = make_rig(2)
    make = Bending(base=SLEEVE, constraint_length_mm=100.0)
    fibers = tuple(replace(each, type=FiberType("x", "bending", make, 1)) for each in rig.fibers)
    hanging = hanging_of(replace(rig, fibers=fibers))
    points = centre_lines(hanging, [0.03, 0.03])
    left, right = points[hanging.first[1] - 1], points[hanging.first[2] - 1]
    assert left[0] < hanging.at[0, 0] - 0.01
    assert right[0] > hanging.at[1, 0] + 0.01
