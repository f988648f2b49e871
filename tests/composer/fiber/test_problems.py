"""What cannot be about a fiber is said at the key to change, with the numbers that an engineer would ask for."""

from dataclasses import replace

import pytest

from composer.faults import Faults
from composer.fiber.modelled import capability
from composer.fiber.problems import problems
from composer.rig.reading import read_rig

from .makes import CORD, EACH, FOLD, PLEAT, mounted
from .rigs import rig_of


def said(*args, **values) -> str:
    with pytest.raises(Faults) as caught:
        read_rig(rig_of(*args, **values), "bench.rig.toml")
    return str(caught.value)


GOLDEN = {
    "a fiber that cannot lift its load": (
        ("contractile", CORD, "load_N = 40"),
        {},
        """\
bench.rig.toml:33:10: reed.1: a load of 40 N needs 523.9 kPa to begin to move, and it gets 380 kPa (95 % of pressure_kPa); \
expected less than 29 N, or pressure_kPa above 552 and min_pressure_kPa above 552 \
and max_pressure_kPa above 524, or a bundle of 2
   33 | load_N = 40
      |          ^^""",
    ),
    "a braid beyond its limit angle": (
        ("contractile", replace(CORD, braid_angle_deg=56.0)),
        {},
        """\
bench.rig.toml:26:19: braid_angle_deg is 56.0; expected a number from 1 to 54.7 (°)
   26 | braid_angle_deg = 56.0
      |                   ^^^^""",
    ),
    "a wall thicker than its radius": (
        ("contractile", replace(CORD, wall_mm=1.7)),
        {},
        """\
bench.rig.toml:21:11: 'one', used by reed.1 (line 29): a wall of 1.7 mm leaves no bore in a tube of 3 mm; \
expected less than 1.5 mm
   21 | wall_mm = 1.7
      |           ^^^""",
    ),
    "a supply below what the load needs": (
        ("contractile", CORD),
        {"pressure": 20},
        """\
bench.rig.toml:33:10: reed.1: a load of 1.5 N needs 19.65 kPa to begin to move, and it gets 19 kPa (95 % of pressure_kPa); \
expected less than 1.45 N, or pressure_kPa above 20.7, or a bundle of 2
   33 | load_N = 1.5
      |          ^^^""",
    ),
    "a receiver below what the load needs": (
        ("contractile", CORD),
        {"min_pressure": 15},
        """\
bench.rig.toml:33:10: reed.1: a load of 1.5 N needs 19.65 kPa to begin to move, and it gets 14.25 kPa \
(95 % of min_pressure_kPa); expected less than 1.09 N, or min_pressure_kPa above 20.7, or a bundle of 2
   33 | load_N = 1.5
      |          ^^^""",
    ),
    "a fiber that must not have what its load needs": (
        ("contractile", replace(CORD, max_pressure_kPa=10.0)),
        {},
        """\
bench.rig.toml:33:10: reed.1: a load of 1.5 N needs 19.65 kPa to begin to move, and it gets 10 kPa (max_pressure_kPa); \
expected less than 0.764 N, or max_pressure_kPa above 19.7, or a bundle of 2
   33 | load_N = 1.5
      |          ^^^""",
    ),
    "a stroke of zero, by its sleeve": (
        ("extensile", replace(PLEAT, sleeve_limit=0.0)),
        {},
        """\
bench.rig.toml:26:16: sleeve_limit is 0.0; expected a number above 0, up to 10
   26 | sleeve_limit = 0.0
      |                ^^^""",
    ),
    "a stroke of next to nothing, by its sleeve": (
        ("extensile", replace(PLEAT, sleeve_limit=0.00001)),
        {},
        """\
bench.rig.toml:26:16: 'one', used by reed.1 (line 28): its shape ends the motion at a strain of 1e-05; \
expected a stroke of 0.0001 at least
   26 | sleeve_limit = 1e-05
      |                ^^^^^""",
    ),
    "a stroke of next to nothing, by its supply": (
        ("extensile", replace(PLEAT, shear_modulus_kPa=90000.0), "load_N = 0"),
        {"pressure": 1},
        """\
bench.rig.toml:5:16: reed.1: moving by 0.01 % of its length needs 17.3 kPa, and it gets 0.95 kPa (95 % of pressure_kPa); \
expected pressure_kPa above 18.3
    5 | pressure_kPa = 1
      |                ^""",
    ),
    "nothing that brings it back": (
        ("contractile", replace(CORD, shear_modulus_kPa=0.0), "load_N = 0"),
        {},
        """\
bench.rig.toml:22:21: 'one', used by reed.1 (line 29): neither elastomer nor load brings it back to rest: \
0 Pa hold it half way; expected an elastomer that adds 50 Pa at least on the first half of the way, or a load
   22 | shear_modulus_kPa = 0.0
      |                     ^^^""",
    ),
    "a fiber that would jump": (
        ("extensile", replace(PLEAT, shear_modulus_kPa=0.0), "load_N = 1"),
        {},
        """\
bench.rig.toml:22:21: 'one', used by reed.1 (line 28): one pressure, 36.84 kPa, holds it at rest and half way, \
so that it cannot be held in between; expected an elastomer that adds 50 Pa at least on the first half of the way
   22 | shear_modulus_kPa = 0.0
      |                     ^^^""",
    ),
    "a thread longer than its fiber": (
        ("bending", replace(FOLD, constraint_length_mm=110.0), "load_N = 0"),
        {},
        """\
bench.rig.toml:28:24: 'one', used by reed.1 (line 30): a thread holds 110 mm of a fiber of 100 mm; expected at most 100 mm
   28 | constraint_length_mm = 110.0
      |                        ^^^^^""",
    ),
}


@pytest.mark.parametrize("name", GOLDEN)
def test_the_message_reads_so(name):
    args, values, text = GOLDEN[name]
    assert said(*args, **values) == text


def test_a_row_of_fibers_is_blamed_once():
    assert said("contractile", CORD, "load_N = 40", count=24).count("a load of 40 N") == 1


def test_what_a_message_advises_mends_it():
    for change in (
        {"load_N": 28.9},
        {"load_N": 40.0, "bundle": 2},
        {"load_N": 40.0, "pressure_kPa": 553.0, "min_pressure_kPa": 553.0},
    ):
        make = CORD if "pressure_kPa" not in change else replace(CORD, max_pressure_kPa=525.0)
        assert problems(make, mounted(**change)) == [], change


@pytest.mark.parametrize("make", EACH.values(), ids=EACH)
def test_a_fiber_without_problems_has_a_stroke(make):
    assert problems(make, mounted(load_N=0.5)) == []
    assert capability(make, mounted(load_N=0.5)).stroke > 1e-4
