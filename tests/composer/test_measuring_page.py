"""The page on measuring: its example's readings give the numbers of its rig file, by its own formulas."""

import math
import re
import tomllib
from pathlib import Path

import numpy as np
import pytest

from composer.fiber.kinds import KINDS
from composer.fiber.work import exhausting_pressure, filling_pressure
from composer.rig.reading import read_rig
from composer.rig.schema import HANGING, SUPPLY, VALVE_TYPE

PAGE = Path(__file__).parents[2] / "composer" / "manual" / "measuring.md"
TEXT = PAGE.read_text(encoding="utf-8")
RIG = re.search(r"^```toml measured\.rig\.toml\n(.*?)^```$", TEXT, re.MULTILINE | re.DOTALL)[1]
WRITTEN = tomllib.loads(RIG)


def read(what: str) -> list[float]:
    """The numbers of a row of readings."""
    row = next(line for line in TEXT.split("## An example")[1].splitlines() if line.startswith("| ") and what in line)
    return [float(one) for one in re.findall(r"\d+(?:\.\d+)?", row.replace(what, "").rsplit("|", 2)[1])]


def test_the_make_follows_from_its_readings():
    make = WRITTEN["fiber_type"]["reed"]
    outer = read("turns of thread round the braid")[0] / (10 * math.pi)
    bore = math.sqrt(4000 * read("of the bare tube, held upright")[0] / (1000 * math.pi))
    angle = math.atan(math.pi * outer / read("one thread of the braid, one turn")[0])
    stretch = read("0.20 kg on")[0] / 1000
    section = math.pi * (outer**2 - bore**2) / 4
    modulus = 1000 * 9.81 * 0.20 / (section * (stretch - stretch**-2))
    most = 1 - read("shortest without a load")[0] / make["rest_length_mm"]
    into, out = read("at 15 % strain")
    assert make["outer_diameter_mm"] == pytest.approx(outer, rel=0.005)
    assert make["wall_mm"] == pytest.approx((outer - bore) / 2, rel=0.01)
    assert make["braid_angle_deg"] == pytest.approx(math.degrees(angle), abs=0.06)
    assert make["shear_modulus_kPa"] == pytest.approx(modulus, rel=0.01)
    assert make["end_factor"] == pytest.approx((1 - math.sqrt(1 / (3 * math.cos(angle) ** 2))) / most, rel=0.005)
    assert make["friction_fraction"] == pytest.approx((into - out) / (into + out), rel=0.01)


def test_valve_tube_load_and_supply_follow_from_their_readings():
    fibers, valve, supply = WRITTEN["fibers"][0], WRITTEN["valve_type"]["mini"], WRITTEN["supply"]
    (seconds,) = read("a 2 L receiver through the valve")
    assert valve["C_dm3_s_bar"] == pytest.approx(2 / seconds * math.log(601.3 / 401.3), rel=0.01)
    assert fibers["tube_bore_mm"] == pytest.approx(
        math.sqrt(4000 * read("of the valve's tube takes")[0] / (1500 * math.pi)), rel=0.01
    )
    assert fibers["load_N"] == pytest.approx(9.81 * read("what it lifts")[0], rel=0.01)
    (seconds,) = read("L receiver, filled from 500 to 700 kPa")
    assert supply["compressor_L_min"] == pytest.approx(60 * 24 * 200 / (100 * seconds), rel=0.01)


def test_friction_from_two_pressures_at_one_strain_is_that_of_the_physics_whatever_load_and_elastomer():
    make = read_rig(RIG, "measured.rig.toml").fibers[0].type.make
    at = np.array([0.15])
    for load in (0.0, 4.0, 9.0):
        into = filling_pressure(make.shape(), at, load, make.friction_fraction)
        out = exhausting_pressure(make.shape(), at, load, make.friction_fraction)
        assert ((into - out) / (into + out)).item() == pytest.approx(make.friction_fraction, rel=1e-9)


def test_the_end_factor_from_the_greatest_contraction_is_that_of_the_physics():
    make = read_rig(RIG, "measured.rig.toml").fibers[0].type.make
    angle = math.radians(make.braid_angle_deg)
    assert (1 - math.sqrt(1 / (3 * math.cos(angle) ** 2))) / make.shape().stop == pytest.approx(make.end_factor, rel=1e-9)


def test_every_key_that_has_to_be_written_is_told_how_to_measure():
    told = set(re.findall(r"`(\w+)`", TEXT))
    names = {"name", "count", "type", "channel", "kind", "base", "direction"}
    keys = [*SUPPLY.keys, *VALVE_TYPE.keys, *HANGING]
    for kind in KINDS:
        keys += KINDS[kind].keys_of({"kind": kind, "base": "extensile"})
    assert {key.name for key in keys if key.required} - names <= told
