import tomllib

import pytest

from composer.keys import Key
from composer.rig.document import open_document
from composer.rig.values import expected, read_table, say_number

KEYS = (
    Key("number", "number", "a number", "mm", 0.0, 10.0, default=1.0),
    Key("above", "number", "above", low=0.0, above=True, default=1.0),
    Key("whole", "integer", "a whole number", low=1, high=9, default=1),
    Key("text", "text", "a text", default="x"),
    Key("choice", "choice", "a choice", default="a", choices=("a", "b")),
    Key("switch", "switch", "a switch", default=False),
    Key("vector", "vector", "a vector", low=-5.0, high=5.0, default=(0.0, 0.0, 0.0)),
    Key("names", "names", "names", default=()),
)


def read(text, keys=KEYS):
    document = open_document("[t]\n" + text, "f")
    return read_table(document, ("t",), document.values["t"], keys, "[t]"), document.faults


@pytest.mark.parametrize("written", ["4", "4.0", "4e0", "+4", "0.04e2", "0x4", "0b100", "4_0e-1"])
def test_every_spelling_of_a_number_is_the_same_float(written):
    values, faults = read(f"number = {written}")
    assert (values["number"], type(values["number"]), faults) == (4.0, float, [])


@pytest.mark.parametrize("written", ["4", "4.0", "4e0"])
def test_a_whole_number_may_have_a_point(written):
    assert type(read(f"whole = {written}")[0]["whole"]) is int


@pytest.mark.parametrize(
    "written",
    ["number = -0.1", "number = 10.1", "number = nan", "number = inf", "number = -inf", "number = true", "number = '4'",
     "number = [4]", "number = 1979-05-27", "number = {}", "above = 0", "above = -0.0", "whole = 1.5", "whole = 0",
     "whole = 10", "whole = 1e300", "whole = nan", "text = 4", "text = ''", "text = '  '", "choice = 'c'", "choice = 1",
     "choice = ['a']", "switch = 1", "switch = 'true'", "vector = 1", "vector = [1, 2]", "vector = [1, 2, 3, 4]",
     "vector = [1, 2, 'x']", "vector = [0, 0, 6]", "vector = [0, nan, 0]", "vector = [true, 0, 0]", "names = 'a'",
     "names = [1]", "names = [['a']]"],
)  # fmt: skip
def test_a_value_of_another_type_or_range_is_blamed_where_it_stands(written):
    values, faults = read(written)
    assert values is None
    key, value = written.split(" = ")
    assert [(f.where.line, f.where.column, f.where.width) for f in faults] == [(2, len(key) + 4, len(value))]
    assert faults[0].found.startswith(key + " is ")


def test_the_ends_of_a_range_belong_to_it():
    values, faults = read("number = 10\nwhole = 9\nvector = [-5, 5, 0]\nabove = 1e-300")
    assert faults == []
    assert (values["number"], values["whole"], values["vector"]) == (10.0, 9, (-5.0, 5.0, 0.0))


def test_a_zero_with_a_sign_is_zero():
    assert str(read("number = -0.0")[0]["number"]) == "0.0"
    assert str(read("vector = [-0.0, 0, 0]")[0]["vector"][0]) == "0.0"


def test_what_is_not_given_has_its_default():
    assert read("")[0] == {key.name: key.default for key in KEYS}


def test_a_key_without_a_default_must_be_given():
    values, faults = read("", (Key("need", "number", "what for", "kPa", 0.0, 5.0),))
    assert values is None
    assert [(f.found, f.expected, f.hint) for f in faults] == [
        ("[t] has no need", "a number from 0 to 5 (kPa)", "add: need = …   # what for")
    ]


def test_a_key_with_the_wrong_unit_is_offered_the_one_there_is():
    keys = (Key("pressure_kPa", "number", "", default=1.0), Key("polytropic", "number", "", default=1.0))
    for wrong in ("pressure", "pressure_bar", "pressure_psi_gauge", "Pressure_kpa"):
        assert [f.hint for f in read(f"{wrong} = 1", keys)[1]] == ["did you mean 'pressure_kPa'?"]


def test_ranges_are_said_with_their_ends_and_units():
    said = {key.name: expected(key) for key in KEYS}
    assert said["number"] == "a number from 0 to 10 (mm)"
    assert said["above"] == "a number above 0"
    assert said["whole"] == "a whole number from 1 to 9"
    assert said["choice"] == '"a" or "b"'
    assert said["vector"] == "three numbers, [x, y, z] from -5 to 5"


@pytest.mark.parametrize("value", [0.0, 1.0, 0.1, 1e-9, 101.325, 1e6, 1e300])
def test_a_number_said_is_the_number(value):
    assert tomllib.loads(f"x = {say_number(value)}")["x"] == value
