"""The manual's page of faults has the tables as the program has them, and every row of them is done by a test."""

from pathlib import Path

import pytest

import player
from player.engine.alarms import ALARMS, DOES
from player.engine.fault_table import HOST, ROWS
from player.engine.page import alarms_table, faults_table
from player.engine.safety import FAULTS
from player.wire.mishaps import MISHAPS


@pytest.fixture(scope="module")
def page():
    return (Path(player.__file__).parent / "manual" / "faults.md").read_text(encoding="utf-8")


def test_the_page_has_every_row_as_the_table_has_it_and_no_other(page):
    assert faults_table() in page
    assert faults_table().count("\n") == 1 + len(ROWS)


def test_the_page_has_every_alarm_and_what_it_does(page):
    assert alarms_table() in page
    assert all(f"| {name} |" in alarms_table() for name in ALARMS)
    for does, says in DOES.items():
        assert f"| {does} | {says} |" in page


def test_every_fault_code_of_the_wire_has_its_row():
    for code in FAULTS:
        if code != 3:
            assert any(f"(fault {code})" in row.happens for row in ROWS.values()), code
    assert FAULTS[3][0] in ROWS["reset"].told.split(" / ")


def test_whatever_the_simulated_board_can_do_wrong_has_its_row():
    assert set(MISHAPS) - {row.mishap for row in ROWS.values()} == {"slow-clock"}


def test_every_row_of_the_machine_is_done_by_a_test():
    text = (Path(__file__).parent / "test_hosts.py").read_text()
    assert all(f'"{name}"' in text for name in HOST)
