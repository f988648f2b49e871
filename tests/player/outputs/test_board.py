"""A board on a line: a simulated one, behind a pseudo-terminal, in a process of its own."""

import csv
import json
import os
import signal
import subprocess
import sys
import time
from itertools import pairwise

import pytest

from player.wire.line import highest_rate


def drawcord(*arguments):
    command = [sys.executable, "-m", "player.commands.main", *arguments]
    return subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, stdin=subprocess.DEVNULL, text=True)


@pytest.fixture
def bench(tmp_path, monkeypatch, rig_text, score_text):
    """A folder with a rig, a score and a board; `start` begins a board and gives its process and port."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    (tmp_path / "bench.score").write_text(score_text.format(times=4, length="1.5", up="0.6", down="1.2"))
    begun = []

    def start(rig="bench.rig.toml", *more):
        board = drawcord("device", rig, "--log", "board.csv", *more)
        begun.append(board)
        return board, board.stdout.readline().strip()

    yield start
    for board in begun:
        board.kill()
        board.wait()
        board.stdout.close()
        board.stderr.close()


def play(port, *more, baud=2_000_000):
    return drawcord("play", "bench.score", "--to", f"serial:{port}@{baud}", "--arm", "--json", *more)


def rows(event):
    with open("board.csv", newline="") as file:
        return [row for row in csv.DictReader(file) if row["event"] == event]


def when_applied(count):
    for _ in range(400):
        if os.path.exists("board.csv") and len(rows("set")) >= count:
            return
        time.sleep(0.05)
    raise AssertionError("no set was applied")


def ended(process):
    out, err = process.communicate(timeout=60)
    assert "Traceback" not in err
    return process.returncode, json.loads(out) if out else None, err


def test_every_set_of_a_score_is_applied_and_the_board_ends_idle(bench):
    _, port = bench()
    code, found, _ = ended(play(port))
    assert code == 0 and found["ended"] == "end" and found["faults"] == []
    assert len(rows("set")) == found["outputs"][0]["sets"] == found["ticks"]
    due = [int(row["due_us"]) for row in rows("set")]
    steps = [later - earlier for earlier, later in pairwise(due)]
    # 5 ms a tick; what differs is the estimate of the board's clock as it settles.
    assert min(steps) > 3000 and max(steps) < 7000
    assert rows("status")[-1]["note"].startswith("armed to idle")
    assert found["largest_error"]["error_of_stroke"] < 0.1


def test_a_stop_brings_the_board_to_rest_and_a_second_one_vents_it(bench):
    _, port = bench()
    playing = play(port)
    when_applied(40)
    playing.send_signal(signal.SIGINT)
    assert ended(playing)[:1] == (0,)
    assert rows("status")[-1]["note"].startswith("armed to idle")
    before = len(rows("set"))
    playing = play(port)
    when_applied(before + 40)
    playing.send_signal(signal.SIGINT)
    playing.send_signal(signal.SIGTERM)
    code, found, _ = ended(playing)
    assert (code, found["state"]) == (1, "vented")
    assert rows("status")[-1]["note"].startswith("armed to vented: vent")


def test_a_player_that_is_killed_leaves_a_board_that_vents_by_its_watchdog(bench):
    _, port = bench()
    playing = play(port)
    when_applied(40)
    # The run is a process of its own, which would bring all to rest if its front end alone were gone.
    with open(f"/proc/{playing.pid}/task/{playing.pid}/children") as file:
        runs = [int(pid) for pid in file.read().split()]
    assert runs
    for pid in (playing.pid, *runs):
        os.kill(pid, signal.SIGKILL)
    playing.communicate()
    for _ in range(100):
        if rows("status")[-1]["note"] == "armed to vented: watchdog":
            return
        time.sleep(0.05)
    raise AssertionError(rows("status")[-1])


def test_a_port_that_vanishes_in_mid_run_ends_it_in_a_fault(bench):
    board, port = bench()
    playing = play(port)
    when_applied(40)
    board.kill()
    code, found, _ = ended(playing)
    assert (code, found["ended"]) == (1, "fault") and "vanished" in found["faults"][0]["say"]


def test_a_line_that_is_too_slow_is_refused_with_the_rate_that_it_carries(bench):
    _, port = bench()
    code, found, err = ended(play(port, "--rate", "1000", baud=115200))
    assert code == 2 and found is None and "play with --rate " in err
    assert int(err.rsplit("--rate ", 1)[1]) == highest_rate(4, 115200)
    code, found, _ = ended(play(port, "--rate", "100", baud=115200))
    assert code == 0 and found["rate_Hz"] == 100.0


def test_a_board_for_another_rig_is_refused_before_arming(bench, tmp_path, rig_text):
    (tmp_path / "other.rig.toml").write_text(rig_text.replace("stroke = 0.3", "stroke = 0.2"))
    _, port = bench("other.rig.toml")
    code, found, err = ended(play(port))
    assert code == 2 and found is None and "not so: main: it is set up for this rig" in err
    assert not any("armed" in row["note"] for row in rows("status"))


def test_without_a_terminal_and_without_arm_nothing_is_armed(bench):
    _, port = bench()
    code, _, err = ended(drawcord("play", "bench.score", "--to", f"serial:{port}"))
    assert code == 2 and "give --arm" in err


def test_a_port_that_another_player_holds_is_refused(bench, tmp_path, score_text):
    (tmp_path / "bench.score").write_text(score_text.format(times=100, length="1.5", up="0.6", down="1.2"))
    _, port = bench()
    playing = play(port)
    when_applied(40)
    code, _, err = ended(play(port))
    assert code == 2 and "busy" in err
    playing.send_signal(signal.SIGINT)
    assert ended(playing)[0] == 0
