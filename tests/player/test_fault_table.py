"""Everything in the table of faults, done for real: a board on a pseudo-terminal, a player in a process of its own."""

import json
import os
import resource
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

import player
from player.engine.alarms import ALARMS, DOES
from player.engine.fault_table import ROWS
from player.engine.run_log import records

SHORT = ("unplugged", "garbage-1", "other-rig", "leak", "over-pressure", "killed", "stopped-500-ms", "two-players", "log-full")
"""What is done in every run of the tests; the others want more than a minute together."""

SCORE = """title "Bench piece"
rig bench.rig.toml
tempo 120
phrase nod 8
  0 rest
  1 full
  4 full
  5 rest
section only at 1:1
  r.* nod times 2
"""
MAIN = [sys.executable, "-m", "player.commands.main"]


def row_of(name):
    return pytest.param(name, marks=() if name in SHORT else pytest.mark.soak)


class Stage:
    """A board and players, all ended at the end."""

    def __init__(self):
        self.started = []

    def start(self, *arguments, **more):
        self.started.append(subprocess.Popen([*MAIN, *arguments], stdin=subprocess.DEVNULL, text=True, **more))
        return self.started[-1]

    def board(self, mishap):
        more = ["--fault", mishap] if mishap else []
        # The board in C where it can be had.
        more += ["--portable"] if shutil.which("gcc") else []
        self.device = self.start("device", "bench.rig.toml", "--log", "board.csv", *more, stdout=subprocess.PIPE)
        return self.device.stdout.readline().strip()

    def play(self, port, *more, **kept):
        pipes = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE}
        log = ["--log", "run.log"] if "--log" not in more else []
        return self.start("play", "bench.score", "--to", f"serial:{port}", "--arm", "--json", *log, *more, **pipes, **kept)


@pytest.fixture
def stage(tmp_path, monkeypatch, rig_text):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    (tmp_path / "bench.score").write_text(SCORE)
    stage = Stage()
    yield stage
    for process in stage.started:
        if process.poll() is None:
            process.send_signal(signal.SIGCONT)
            process.terminate()
            process.wait(20)
        for pipe in (process.stdout, process.stderr):
            if pipe is not None:
                pipe.close()


def moving(path="run.log"):
    """Wait until the fibers move."""
    end = time.monotonic() + 60.0
    while time.monotonic() < end:
        if os.path.exists(path) and os.path.getsize(path) > 12_000:
            return
        time.sleep(0.02)
    raise AssertionError("the run did not begin")


def whole(path="run.log"):
    """The log's records; it must be whole up to where it ends."""
    with open(path, "rb") as file:
        found, left = records(file.read())
    assert left == 0 and found[0].kind == "head"
    return found


def ended_as(row, playing):
    """Hold the end of a run against its row; returns the report, None where there is none."""
    out, err = playing.communicate(timeout=90)
    assert playing.returncode == row.exit, (out, err)
    if not row.state:
        assert row.told in err and out == ""
        return None
    told = json.loads(out)
    said = " ".join(fault["say"] for fault in told["faults"])
    assert (told["state"], told["ended"]) == (row.state, row.ended), told
    assert row.told in said and bool(said) == bool(row.exit)
    return told


@pytest.mark.parametrize("name", [row_of(name) for name, row in ROWS.items() if row.mishap])
def test_a_board_that_goes_wrong_ends_the_run_as_the_table_says(stage, name):
    row = ROWS[name]
    told = ended_as(row, stage.play(stage.board(row.mishap)))
    if told is not None:
        kinds = {record.kind for record in whole()}
        assert {"head", "set", "sense", "state", "end"} <= kinds
    # Nothing is left open: the last that the board did was to exhaust.
    assert stage.device.poll() is None


def test_a_board_that_is_unplugged_ends_the_run_at_rest(stage):
    playing = stage.play(stage.board(""))
    moving()
    stage.device.kill()
    told = ended_as(ROWS["unplugged"], playing)
    assert told["outputs"][0]["sets"] > 0 and whole()[-1].kind == "end"


def test_a_player_that_is_killed_leaves_a_log_that_is_whole_and_a_board_that_vents(stage):
    playing = stage.play(stage.board(""))
    moving()
    playing.kill()
    assert playing.wait(20) == ROWS["killed"].exit
    end = time.monotonic() + 20.0
    while "watchdog" not in Path("board.csv").read_text() and time.monotonic() < end:
        time.sleep(0.05)
    assert "watchdog" in Path("board.csv").read_text()
    with open("run.log", "rb") as file:
        found, _ = records(file.read())
    assert found[-1].kind in ("set", "sense", "supply", "board") and len(found) > 50


@pytest.mark.parametrize(
    ("name", "seconds"), [pytest.param("stopped-50-ms", 0.05, marks=pytest.mark.soak), ("stopped-500-ms", 0.5)]
)
def test_a_machine_that_stands_still_is_unseen_or_ends_vented(stage, name, seconds):
    playing = stage.play(stage.board(""))
    moving()
    playing.send_signal(signal.SIGSTOP)
    time.sleep(seconds)
    playing.send_signal(signal.SIGCONT)
    ended_as(ROWS[name], playing)


def test_a_log_that_finds_no_room_ends_whole_and_the_run_goes_on(stage):
    def little_room():
        resource.setrlimit(resource.RLIMIT_FSIZE, (20_000, 20_000))

    ended_as(ROWS["log-full"], stage.play(stage.board(""), preexec_fn=little_room))
    with open("run.log", "rb") as file:
        found, _ = records(file.read())
    assert found[-1].kind in ("set", "sense", "supply")


def test_a_second_player_on_a_port_is_told_that_it_is_busy(stage):
    port = stage.board("")
    first = stage.play(port)
    moving()
    second = stage.play(port, "--log", "second.log")
    ended_as(ROWS["two-players"], second)
    first.send_signal(signal.SIGINT)
    out, _ = first.communicate(timeout=60)
    assert json.loads(out)["faults"] == [] and first.returncode == 0


@pytest.fixture(scope="module")
def page():
    return (Path(player.__file__).parent / "manual" / "faults.md").read_text(encoding="utf-8")


def test_the_page_has_every_row_as_the_table_has_it_and_no_other(page):
    said = [line for line in page.splitlines() if line.count("|") == 6]
    assert said[2:] == [
        f"| {row.happens} | {row.exit} | {row.state or '–'} | {'“' + row.told + '”' if row.told else '–'} | {row.then} |"
        for row in ROWS.values()
    ]


def test_the_page_has_every_alarm_and_what_it_does(page):
    for name, row in ALARMS.items():
        assert f"| {name} | {row.seen} | {row.does} | {row.hint} |" in page
    for does, says in DOES.items():
        assert f"| {does} | {says} |" in page
