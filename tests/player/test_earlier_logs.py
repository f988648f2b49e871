"""What a run takes up from the logs of those before it."""

import os

import numpy as np
import pytest

from player.commands.earlier_logs import learned
from player.engine.run_log import RunLog
from player.engine.trim import LEVELS

LEARNED = [[0.01 * level for level in range(len(LEVELS))], [-0.02] * len(LEVELS)]


def kept(folder, name, day, fingerprint="0a", **end):
    """A log of nothing but its beginning and its end, written on a day."""
    data = bytearray()
    log = RunLog(data.extend)
    date = f"2026-01-{day:02}"
    log.tell("head", 0.0, fibers=["a", "b"], stroke=[0.3, 0.3], rate_Hz=100.0, date=date, fingerprint=fingerprint)
    log.tell("end", 1.0, ended="end", exit=0, **end)
    (folder / name).write_bytes(data)
    os.utime(folder / name, (day, day))


def test_what_the_newest_run_of_this_rig_learned_is_taken_up(tmp_path):
    kept(tmp_path, "first.log", 1, trim=[[0.05] * len(LEVELS)] * 2)
    kept(tmp_path, "second.log", 2, trim=LEARNED)
    kept(tmp_path, "third.log", 3)
    kept(tmp_path, "another rig.log", 4, "0b", trim=[[0.05] * len(LEVELS)] * 2)
    (tmp_path / "notes.txt").write_text("no log")
    name, by = learned(str(tmp_path / "fourth.log"), "0a", 2)
    assert name == "second.log"
    assert np.array_equal(by, LEARNED)


def test_of_a_log_that_is_written_over_each_night_the_last_night_counts(tmp_path):
    kept(tmp_path, "night.log", 1, trim=LEARNED)
    assert learned(str(tmp_path / "night.log"), "0a", 2)[0] == "night.log"


def test_without_a_log_or_one_of_this_rig_nothing_is_taken_up(tmp_path):
    kept(tmp_path, "night.log", 1, "0b", trim=LEARNED)
    assert learned(None, "0a", 2) is None
    assert learned(str(tmp_path / "tonight.log"), "0a", 2) is None
    assert learned(str(tmp_path / "nowhere" / "tonight.log"), "0a", 2) is None


@pytest.mark.parametrize(
    "trim", [None, 5, [], LEARNED[:1], [[0.0], [0.0]], [LEARNED[0], ["x"] * len(LEVELS)], [LEARNED[0], [0.3] * len(LEVELS)]]
)
def test_ends_that_say_nonsense_of_what_was_learned_are_passed_over(tmp_path, trim):
    kept(tmp_path, "night.log", 1, trim=trim)
    assert learned(str(tmp_path / "tonight.log"), "0a", 2) is None
