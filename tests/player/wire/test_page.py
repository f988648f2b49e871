from pathlib import Path

import pytest

import player
from player.wire import page, rules
from player.wire.line import highest_rate, set_bytes
from player.wire.messages import SPECS

MANUAL = Path(player.__file__).parent / "manual"
WIRE = (MANUAL / "wire.md").read_text(encoding="utf-8")
DEVICE = (MANUAL / "device.md").read_text(encoding="utf-8")


@pytest.mark.parametrize("direction", ["to device", "to host"])
def test_the_manual_has_the_table_of_messages_as_the_program_has_it(direction):
    assert page.messages_table(direction) in WIRE
    assert page.messages_table(direction).count("\n") == 1 + sum(spec.direction == direction for spec in SPECS)


def test_the_manual_has_every_fault_and_every_text_of_a_refusal():
    assert page.refusals_table() in WIRE
    assert all(text in page.refusals_table() for _, text in rules.REFUSALS.values())
    assert page.statuses() in WIRE


def test_the_manual_has_as_many_rules_as_the_device():
    numbers = [int(line.split(".")[0]) for line in WIRE.splitlines() if line.split(".")[0].isdigit()]
    own = [int(line.split(".")[0]) for line in rules.__doc__.splitlines() if line.split(".")[0].isdigit()]
    assert numbers == own == list(range(1, len(own) + 1))


def test_the_manual_tells_what_a_line_carries_as_the_program_works_it_out():
    assert f"{highest_rate(48, 115_200)} Hz at 115200 baud, {highest_rate(48, 2_000_000)} Hz at 2 000 000" in WIRE
    for n in (1, 48, 120, 121, 500, 1020):
        assert set_bytes(n) == 14 + 2 * n + (12 + 2 * n) // 254


def test_the_manual_has_every_mishap_of_the_simulated_board():
    assert page.mishaps_table() in DEVICE


def test_the_manual_has_every_column_of_the_log():
    from player.outputs.serial_board import HEADER

    assert all(f"`{column}`" in DEVICE for column in HEADER.strip().split(","))
