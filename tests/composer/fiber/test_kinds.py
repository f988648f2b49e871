import pytest

from composer.fiber.kinds import KINDS
from composer.rig.reading import read_rig

from .makes import EACH
from .rigs import rig_of


def test_every_kind_is_a_row():
    assert set(KINDS) == {"rated", "contractile", "extensile", "bending", "coiling"}


@pytest.mark.parametrize("kind", EACH)
def test_a_fiber_of_each_kind_is_read_to_the_make_that_its_keys_say(kind):
    made = read_rig(rig_of(kind, EACH[kind]), "bench.rig.toml").fiber_types["one"]
    assert made.kind == kind
    assert made.make == EACH[kind]


@pytest.mark.parametrize("kind", ["bending", "coiling"])
def test_held_fibers_take_degrees_and_straight_ones_millimetres(kind):
    assert KINDS[kind].units == {"%", "deg"}
    assert KINDS["contractile"].units == KINDS["extensile"].units == {"%", "mm"}


def test_the_keys_of_a_held_fiber_are_those_of_its_base_and_its_own():
    names = {key.name for key in KINDS["coiling"].keys_of({"base": "contractile"})}
    assert {"base", "braid_angle_deg", "constraint_length_mm", "constraint_pitch_mm"} <= names
    assert "sleeve_limit" not in names
    assert "sleeve_limit" in {key.name for key in KINDS["bending"].keys_of({"base": "extensile"})}
