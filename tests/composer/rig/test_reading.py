import tomllib
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.faults import Faults
from composer.rig.reading import read_rig
from composer.rig.schema import MOST_FAULTS, MOST_LINE

CASES = tomllib.loads(Path(__file__).with_name("said.toml").read_text())["case"]


@pytest.mark.parametrize("case", CASES, ids=[case["name"] for case in CASES])
def test_what_is_wrong_is_said_as_a_person_needs_it(spoil, case):
    assert spoil(*case["changes"]) == case["said"]


def test_a_small_rig_is_read_whole(small):
    rig = read_rig(small, "bench.rig.toml")
    assert (rig.name, rig.file, rig.worn) == ("Bench", "bench.rig.toml", False)
    assert [fiber.name for fiber in rig.fibers] == ["reed.1", "reed.2", "reed.3", "reed.4", "tip"]
    assert [fiber.channel for fiber in rig.fibers] == [0, 1, 2, 3, 4]
    assert [fiber.line for fiber in rig.fibers] == [26, 26, 26, 26, 33]
    assert [fiber.driver for fiber in rig.fibers] == ["left"] * 5
    assert [fiber.mirror for fiber in rig.fibers] == [3, 2, 1, 0, None]
    assert [fiber.at_m for fiber in rig.fibers][:4] == [(0.0, 0.0, 0.0), (0.1, 0.0, 0.0), (0.2, 0.0, 0.0), (0.3, 0.0, 0.0)]
    assert rig.fibers[4].toward == (0.0, 0.0, -1.0)
    assert rig.fiber_types["drop"].line == 11
    assert rig.fiber_types["drop"].make.air_mL == 3.0
    assert rig.valve_types["mini"].drive == "pressure"
    assert (rig.supply.min_pressure_kPa, rig.supply.ambient_kPa) == (450.0, 101.325)
    assert rig.groups == {"reeds": (0, 1, 2, 3)}


def test_all_that_is_wrong_comes_at_once_in_the_order_of_the_lines(spoil):
    said = spoil(
        ('name = "Bench"', "nam = 1"),
        ("receiver_L = 10", "receiver_L = -1"),
        ("stroke = 0.3", "stroke = nan"),
        ("C_dm3_s_bar = 0.005", "C = 0.005"),
        ("channels = 8", "channels = 0"),
        ("count = 4", "count = 0"),
        ("channel = 4", 'channel = 4\nvalve = "maxi"\nmirror = "nobody"'),
        ('["reed.*"]', '["rigs"]\nrigs = ["reeds"]'),
    )
    lines = [int(line.split(":")[1]) for line in said.split("\n") if line.startswith("bench")]
    assert lines == [2, 7, 15, 21, 24, 28, 37, 41]


def test_names_are_not_blamed_where_another_table_s_fault_keeps_the_fibers_back(spoil):
    said = spoil(("count = 4", "count = 0"), ("channel = 4", 'channel = 4\nmirror = "reed.1"'))
    assert said.count("bench.rig.toml:") == 1


def test_a_type_with_a_fault_is_not_said_to_be_missing(spoil):
    assert spoil(("stroke = 0.3", "stroke = 0")).count("bench.rig.toml:") == 1


def test_a_rig_without_a_driver_has_one_called_main_with_the_channels_in_use(small):
    rig = read_rig(small.replace("[driver.left]\nchannels = 8\n", "").replace("channel = 4", "channel = 9"), "f")
    assert [(board.name, board.channels) for board in rig.drivers] == [("main", 10)]
    assert {fiber.driver for fiber in rig.fibers} == {"main"}


def test_the_pressure_short_of_air_is_the_regulator_s_where_it_is_not_given(small):
    assert read_rig(small.replace("min_pressure_kPa = 450\n", ""), "f").supply.min_pressure_kPa == 400.0


def test_fibers_come_in_the_order_of_the_file_whichever_way_they_are_written(small):
    first = '[[fiber]]\nname = "first"\ntype = "drop"\nchannel = 7\n\n[[fibers]]'
    rig = read_rig(small.replace("[[fibers]]", first), "f")
    assert [fiber.name for fiber in rig.fibers] == ["first", "reed.1", "reed.2", "reed.3", "reed.4", "tip"]
    assert [fiber.mirror for fiber in rig.fibers] == [None, 4, 3, 2, 1, None]


def test_inline_tables_and_dotted_keys_say_the_same_as_headers(small):
    inline = small.replace("[driver.left]\nchannels = 8\n", "").replace("[rig]\n", "driver.left = {channels = 8}\n[rig]\n")
    assert read_rig(inline, "f").fingerprint == read_rig(small, "f").fingerprint


def test_line_ends_of_another_system_change_nothing_and_columns_stay(small):
    assert read_rig(small.replace("\n", "\r\n"), "f").fingerprint == read_rig(small, "f").fingerprint
    with pytest.raises(Faults, match=r"^f:2:8: name is 3; "):
        read_rig(small.replace('"Bench"', "3").replace("\n", "\r\n"), "f")


def test_a_group_may_name_groups_and_its_name_may_have_dots(small):
    text = small.replace(
        '["reed.*"]', '["reed.3", "reed.1"]\nwing.left = ["tip", "reeds"]\n"wing.all" = ["wing.left", "reed.2-4"]'
    )
    assert read_rig(text, "f").groups == {"reeds": (0, 2), "wing.left": (0, 2, 4), "wing.all": (0, 1, 2, 3, 4)}


def test_a_key_of_a_held_fiber_is_not_blamed_while_its_base_is_unknown(spoil):
    said = spoil(('kind = "rated"', 'kind = "bending"\nbase = "woven"\nconstraint_length_mm = 100'))
    assert said == (
        'bench.rig.toml:13:8: base is "woven"; expected "contractile" or "extensile"\n'
        '   13 | base = "woven"\n'
        "      |        ^^^^^^^"
    )


def test_what_a_kind_finds_wrong_with_a_make_is_said_at_the_key_once_for_a_row(small):
    make = """\
kind = "contractile"
rest_length_mm = 400
outer_diameter_mm = 3
wall_mm = 1.6
braid_angle_deg = 22
shear_modulus_kPa = 300
max_pressure_kPa = 450
"""
    start, end = small.index('kind = "rated"'), small.index("\n[valve_type")
    with pytest.raises(Faults) as caught:
        read_rig(small[:start] + make + small[end:], "f")
    found = [(fault.where.line, fault.where.text) for fault in caught.value.faults]
    assert set(found) == {(15, "wall_mm = 1.6")}
    assert "'drop', used by reed.1" in caught.value.faults[0].found


def test_of_very_many_faults_the_first_hundred_are_said(small):
    with pytest.raises(Faults) as caught:
        read_rig(small + "".join(f"g{n} = 1\n" for n in range(5000)), "f")
    assert len(caught.value.faults) == MOST_FAULTS + 1
    assert caught.value.faults[-1].found == "100 faults so far; the rest is not looked at"


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("x = " + "[" * 2000 + "]" * 2000, "lists or tables within one another, too deep to read"),
        ("x = 1" + "0" * MOST_LINE, "a line of 4101 characters"),
        ("x = [" + "\n" * 100_000 + "]", "the rig file has 100001 lines"),
        ("x = '''" + "0\n" * 99_000 + "'''" + ("#" + "x" * 4000 + "\n") * 500, "the rig file has 2199010 bytes"),
        ("a" + ".a" * 2000 + " = 1", "a key of more than 16 parts"),
        ("", "the rig file has no [rig]"),
    ],
)
def test_text_beyond_the_bounds_is_refused(text, said):
    with pytest.raises(Faults) as caught:
        read_rig(text, "f")
    assert caught.value.faults[0].found == said


MARKS = ["[", "]", "[[", "]]", "=", "\n", ".", ",", '"', "'", '"""', "{", "}", "#", "é", "\0", "\r", "1", "-1", "nan", "true"]
WORDS = ["rig", "supply", "fiber", "fibers", "group", "driver", "name", "count", "kind", "[[fiber]]\n", "[group]\n"]
PIECES = st.sampled_from(MARKS + WORDS)


@given(st.one_of(st.text(), st.lists(PIECES, max_size=30).map("".join), st.binary().map(lambda b: b.decode("latin-1"))))
def test_no_text_gets_anything_but_faults(text):
    with pytest.raises(Faults):
        read_rig(text, "f")


@given(st.data())
def test_a_rig_with_any_part_replaced_is_read_or_gets_faults_with_places_that_exist(data):
    small = Path(__file__).with_name("small.rig.toml").read_text()
    start = data.draw(st.integers(0, len(small)))
    end = data.draw(st.integers(start, min(len(small), start + 40)))
    text = small[:start] + data.draw(st.lists(PIECES, max_size=3).map("".join)) + small[end:]
    try:
        rig = read_rig(text, "f")
    except Faults as wrong:
        lines = text.replace("\r\n", "\n").split("\n")
        for fault in wrong.faults:
            assert 0 <= fault.where.line <= len(lines)
            assert fault.where.line == 0 or 1 <= fault.where.column <= len(lines[fault.where.line - 1]) + 1
            assert fault.where.line == 0 or fault.where.text == lines[fault.where.line - 1]
    else:
        assert rig.fibers
