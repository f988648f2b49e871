"""What a fit tells: a table that a rig file takes, sentences, JSON."""

import json
import tomllib

import numpy as np
import pytest

from composer.fit.fitted import Fitted, Found
from composer.report.fit import as_json, as_table, interval_text, sentences, value_text
from composer.rig.reading import read_rig

RIG = """
[rig]
name = "R"
[supply]
pressure_kPa = 400
receiver_L = 10
max_receiver_kPa = 800
compressor_L_min = 40
[valve_type.mini]
C_dm3_s_bar = 0.1
[[fiber]]
name = "f"
type = "NAME"
channel = 0
"""
VALUES = {
    "rest_length_mm": 400.0,
    "outer_diameter_mm": 3.0,
    "wall_mm": 0.5,
    "shear_modulus_kPa": 299.8712,
    "friction_fraction": 0.0,
    "settle_ms": 14.96,
    "max_pressure_kPa": 400.0,
    "rated_cycles": 1000,
    "braid_angle_deg": 22.0412,
    "end_factor": 1.14892,
}
FOUND = (
    Found("shear_modulus_kPa", "kPa", 299.8712, 299.42, 300.32, True),
    Found("braid_angle_deg", "°", 22.0412, 21.948, 22.135, True),
    Found("end_factor", "", 1.14892, 1.1467, 1.1512, True),
    Found("friction_fraction", "", 0.0, 0.0, 0.02, False, "it needs pressure that goes both up and down"),
    Found("settle_ms", "ms", 14.96, 0.0, 5000.0, False, "the bench says nothing of it", held=True),
)


def fitted(name="cord"):
    line = np.linspace(0.0, 1.0, 50)
    known = {"rest_length_mm": "as the bench file says"}
    pair = (("braid_angle_deg", "end_factor", -0.97),)
    return Fitted(
        name, "contractile", VALUES, FOUND, known, 1.5, 50, 50, line, line, line, line, 0.001, 0.3, pair, ("mind the gap",)
    )


@pytest.mark.parametrize("name", ["cord", "a.b", "x_1-2"])
def test_the_table_is_one_that_a_rig_file_takes(name):
    made = read_rig(RIG.replace("NAME", name) + as_table(fitted(name), "b.csv"), "r").fiber_types[name].make
    assert made.shear_modulus_kPa == pytest.approx(299.87, abs=0.01)
    assert made.braid_angle_deg == pytest.approx(22.041, abs=0.001)
    assert (made.rest_length_mm, made.rated_cycles, made.friction_fraction) == (400.0, 1000, 0.0)


def test_the_table_with_its_remarks_is_toml_by_itself():
    assert tomllib.loads(as_table(fitted(), "b\x07\n.csv"))["fiber_type"]["cord"]["kind"] == "contractile"


def test_what_the_data_cannot_tell_stands_beside_its_value():
    lines = {line.split(" = ")[0]: line for line in as_table(fitted(), "b.csv").splitlines()}
    assert "THE DATA CANNOT TELL: 0 to 0.02" in lines["friction_fraction"]
    assert lines["settle_ms"].startswith("settle_ms = 14.96 ") and "not found but taken" in lines["settle_ms"]
    assert "# 299.42 to 300.32 kPa" in lines["shear_modulus_kPa"]


def test_the_sentences_name_what_is_untold_and_what_is_hardly_apart():
    told = list(sentences(fitted(), "/some/where/b.csv"))
    assert told[0].startswith("fitted from b.csv: 50 rows")
    assert any("cannot tell friction_fraction: it needs pressure" in line for line in told)
    assert any("braid_angle_deg and end_factor are hardly told apart" in line for line in told)
    assert told[-1] == "mind the gap"


@pytest.mark.parametrize(
    "value, half, text",
    [
        (299.8712, 0.45, "299.87"),
        (22.0412, 0.094, "22.041"),
        (0.04023, 0.0005, "0.04023"),
        (14963.2, 120.0, "14960"),
        (0.0000122, 0.0006, "0.00001"),
        (0.0000012, 0.0006, "0"),
        (0.0, 0.1, "0"),
    ],
)
def test_a_value_has_the_digits_that_its_interval_is_worth(value, half, text):
    assert value_text(Found("x", "", value, value - half, value + half, True)) == text


def test_an_interval_has_its_unit():
    assert interval_text(FOUND[0]) == "299.42 to 300.32 kPa"


def test_the_json_holds_everything_and_no_nan():
    report = json.loads(json.dumps(as_json(fitted(), "b.csv"), allow_nan=False))
    assert [one["key"] for one in report["parameters"]] == [one.key for one in FOUND]
    assert report["parameters"][4]["held"] and not report["parameters"][4]["told"]
    assert report["given"] == {"rest_length_mm": 400.0} and report["load_N"] == 1.5
    assert report["table"] == as_table(fitted(), "b.csv")
