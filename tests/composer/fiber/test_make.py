from dataclasses import replace

import pytest

from .makes import CORD, EACH, PLEAT


@pytest.mark.parametrize("make", [CORD, PLEAT])
def test_a_wall_as_thick_as_the_radius_leaves_no_bore(make):
    thick = replace(make, wall_mm=make.radius_mm)
    [(key, found, expected)] = thick.problems()
    assert key == "wall_mm"
    assert found == f"a wall of {make.radius_mm:g} mm leaves no bore in a tube of {make.outer_diameter_mm:g} mm"
    assert expected == f"less than {make.radius_mm:g} mm"


@pytest.mark.parametrize("make", EACH.values(), ids=EACH)
def test_a_sound_make_has_no_problems(make):
    assert make.problems() == []


@pytest.mark.parametrize("kind", ["bending", "coiling"])
def test_the_walls_of_held_fibers_are_looked_at_too(kind):
    assert [key for key, _, _ in replace(EACH[kind], base=replace(PLEAT, wall_mm=4.0)).problems()] == ["wall_mm"]
