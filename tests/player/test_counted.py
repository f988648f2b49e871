"""What outputs have counted, in words."""

import pytest

from player.commands.counted import LOST, sentence, small

BOARD = {"target": "serial:/dev/ttyACM0", "drivers": ["left"], "sets": 200, **dict.fromkeys(LOST, 0)}


@pytest.mark.parametrize(
    ("value", "said"),
    [(0.0, "0.00"), (0.004, "less than 0.01"), (-0.004, "less than 0.01"), (0.005001, "0.01"), (12.0, "12.00")],
)
def test_a_number_too_small_for_its_decimals_is_not_called_nothing(value, said):
    assert small(value) == said


def test_a_simulated_run_tells_its_supply_and_whether_all_is_at_rest():
    run = {"target": "sim", "drivers": ["main"], "sets": 5743, "lowest_supply_kPa": 599.6, "strain_left": 0.0}
    assert sentence(run) == "sim (main): 5743 sets, the supply never below 600 kPa, all at rest in the end."
    assert "a strain of up to 12.00 % left in the end" in sentence({**run, "strain_left": 0.12})


def test_a_recording_tells_its_size():
    run = {"target": "file:run.rec", "drivers": ["left", "right"], "sets": 1, "bytes": 2048}
    assert sentence(run) == "file:run.rec (left+right): 1 set, 2 KiB."


def test_a_sound_line_is_told_in_three_words():
    assert sentence(BOARD) == "serial:/dev/ttyACM0 (left): 200 sets, none lost, late or damaged."


def test_what_went_wrong_on_a_line_is_counted_by_name():
    said = sentence({**BOARD, "skipped": 1, "late_at_board": 3, "clock_bound_us": 1868.0, "round_trip_us": 2091.4})
    assert "200 sets, 1 set not sent, 3 sets late at the board, clock known to 1.9 ms, answers within 2.1 ms." in said
    assert "none lost" not in said
