"""Every key of every table in one rig, each with a value other than its default."""

import tomllib
from pathlib import Path

import pytest

from composer.faults import Faults
from composer.fiber.kinds import KINDS
from composer.keys import REQUIRED
from composer.rig.reading import read_rig
from composer.rig.schema import DRIVER, FIBER, FIBERS, RIG, SUPPLY, TABLES, VALVE_TYPE, keys_of_type

FULL = Path(__file__).with_name("full.rig.toml").read_text()

IDLE = ("", 'medium = "air"', 'valve = "mini"', 'driver = "left"')
"""Lines that say what would hold without them."""


def tables(values):
    """Every table of the file with the keys that it may have."""
    for table in (RIG, SUPPLY):
        yield values[table.name], table.keys
    for table in (VALVE_TYPE, DRIVER):
        yield from ((inner, table.keys) for inner in values[table.name].values())
    yield from ((inner, keys_of_type(inner)) for inner in values["fiber_type"].values())
    for table in (FIBER, FIBERS):
        yield from ((inner, table.keys) for inner in values[table.name])


def test_a_rig_with_every_key_of_every_table_is_read():
    written = {key for table, _ in tables(tomllib.loads(FULL)) for key in table}
    assert written == {key.name for _, keys in tables(tomllib.loads(FULL)) for key in keys}
    rig = read_rig(FULL, "full.rig.toml")
    assert set(tomllib.loads(FULL)) == set(TABLES)
    assert {kind.kind for kind in rig.fiber_types.values()} == set(KINDS)


def test_every_key_of_the_full_rig_reaches_the_rig():
    rig = read_rig(FULL, "full.rig.toml")
    one = rig.fibers[0]
    assert (rig.name, rig.worn, rig.supply.medium, rig.supply.polytropic) == ("Full", True, "air", 1.3)
    assert (rig.supply.ambient_kPa, rig.supply.temperature_C) == (95.0, 25.0)
    assert (one.mounting.tube_bore_mm, one.mounting.tube_length_mm, one.mounting.load_N) == (3.0, 900.0, 0.5)
    assert (one.mounting.bundle, one.mounting.series, one.max_hold_s, one.channel) == (2, 3, 7.0, 30)
    assert one.at_m == (0.0, 1.0, 2.0) and one.toward == (1.0, 0.0, 0.0)
    valve = one.mounting.valve
    assert (valve.C_dm3_s_bar, valve.b, valve.switch_ms, valve.max_switch_Hz) == (0.006, 0.4, 8.0, 40.0)
    assert (valve.drive, valve.duty, valve.duty_burst_s, valve.energised_while_holding) == ("valve", 0.6, 20.0, True)


@pytest.mark.parametrize("table", [RIG, SUPPLY, VALVE_TYPE, DRIVER, FIBER, FIBERS], ids=lambda table: table.name)
def test_a_default_is_in_its_own_range(table):
    from composer.rig.values import _fits

    for key in table.keys:
        if key.default not in (REQUIRED, None):
            value = list(key.default) if isinstance(key.default, tuple) else key.default
            assert _fits(value, key), key.name


@pytest.mark.parametrize("number", range(FULL.count("\n")))
def test_a_line_taken_out_is_a_fault_or_a_default(number):
    lines = FULL.split("\n")
    try:
        rig = read_rig("\n".join(lines[:number] + lines[number + 1 :]), "f")
    except Faults as wrong:
        assert all(fault.where.line <= len(lines) for fault in wrong.faults)
    else:
        was = read_rig(FULL, "f").fingerprint
        assert (rig.fingerprint == was) == (lines[number] in IDLE or lines[number].startswith("#"))
