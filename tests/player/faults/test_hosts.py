"""Rows of the table of faults in which the machine that plays goes wrong, done for real."""

import json
import os
import resource
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from composer.play_file import read_play
from player.engine.fault_table import ROWS
from player.engine.run_log import records

WRITES = """
import os, resource, signal, sys
from composer.play_file import read_play, write_play

new = read_play("new.play")
size = os.path.getsize("new.play")
for offset in [*range(0, size, max(1, size // 40)), size - 1, size]:
    if not os.fork():
        # The system ends the process at once, in mid-write, at exactly this byte.
        signal.signal(signal.SIGXFSZ, signal.SIG_DFL)
        resource.setrlimit(resource.RLIMIT_FSIZE, (offset, offset))
        write_play("kept.play", new)
        os._exit(0)
    _, status = os.wait()
    killed = os.WIFSIGNALED(status)
    assert killed == (offset < size), (offset, size, status)
    print(offset, int(killed), read_play("kept.play").title)
    os.system("cp old.play kept.play") if not killed else None
"""


WRITES_ON = """
from composer.play_file import read_play, write_play

new = read_play("new.play")
print("ready", flush=True)
while True:
    write_play("kept.play", new)
"""


def test_a_player_that_is_killed_leaves_a_log_that_is_whole_and_a_board_that_vents(stage, moving, whole):
    stage.score(8)
    stage.board()
    playing = stage.play()
    moving()
    stage.signal(playing, signal.SIGKILL)
    assert playing.wait(20) == ROWS["killed"].exit
    stage.board_says("armed to vented: watchdog")
    found = whole(cut=True)
    assert found[-1].kind in ("set", "sense", "supply", "board") and len(found) > 30


def test_a_front_end_that_is_killed_leaves_nothing_open_and_a_log_that_is_whole(stage, moving, whole):
    stage.score(8)
    stage.board()
    playing = stage.play()
    moving()
    playing.kill()
    assert playing.wait(20) == ROWS["front-killed"].exit
    stage.shut()
    assert sum(record.kind == "set" for record in whole(cut=True)) > 30


@pytest.mark.parametrize(("name", "seconds"), [("stopped-50-ms", 0.05), ("stopped-500-ms", 0.5), ("stopped-5-s", 5.0)])
def test_a_machine_that_stands_still_is_unseen_or_ends_vented(stage, moving, whole, ended_as, name, seconds):
    stage.score(6)
    stage.board()
    playing = stage.play()
    moving()
    stage.signal(playing, signal.SIGSTOP, signal.SIGCONT, pause_s=seconds)
    ended_as(stage, ROWS[name], playing)
    assert whole()[-1].kind == "end"


def test_a_log_that_finds_no_room_ends_whole_and_the_run_goes_on(stage, ended_as):
    def little_room():
        resource.setrlimit(resource.RLIMIT_FSIZE, (6_000, 6_000))

    stage.board()
    told = ended_as(stage, ROWS["log-full"], stage.play(preexec_fn=little_room))
    with open("run.log", "rb") as file:
        found, _ = records(file.read())
    assert found[-1].kind in ("set", "sense", "supply")
    assert told["outputs"][0]["sets"] > sum(record.kind == "set" for record in found) > 10


def test_a_second_player_on_a_port_is_told_that_it_is_busy(stage, moving):
    row = ROWS["two-players"]
    stage.score(10)
    stage.board()
    first = stage.play()
    moving()
    second = stage.play(log="second.log")
    out, err = second.communicate(timeout=60)
    assert second.returncode == row.exit and out == "" and row.told in err and row.then in err
    first.send_signal(signal.SIGINT)
    out, _ = first.communicate(timeout=60)
    assert json.loads(out)["faults"] == [] and first.returncode == 0
    stage.shut()


def retimed(title, path):
    score = Path("bench.score")
    score.write_text(f'title "{title}"\n' + score.read_text().split("\n", 1)[1])
    subprocess.run([sys.executable, "-m", "player.commands.main", "retime", "bench.score", "-o", path], check=True)


def test_power_that_is_lost_while_a_play_file_is_written_leaves_the_old_one_whole_or_the_new_one(stage):
    retimed("The old", "old.play")
    retimed("The new", "new.play")
    os.link("old.play", "kept.play")
    done = subprocess.run([sys.executable, "-c", WRITES], capture_output=True, text=True, timeout=100)
    assert done.returncode == 0, done.stderr
    rows = [line.split(maxsplit=2) for line in done.stdout.splitlines()]
    assert len(rows) > 40 and {killed for _, killed, _ in rows} == {"0", "1"}
    assert all(title == ("The old" if killed == "1" else "The new") for _, killed, title in rows)
    assert read_play("new.play").title == "The new"


def test_a_writer_of_a_play_file_killed_at_any_moment_leaves_a_whole_one(stage):
    retimed("The old", "kept.play")
    retimed("The new", "new.play")
    for after_s in (0.0, 0.003, 0.011, 0.027, 0.05):
        writer = subprocess.Popen([sys.executable, "-c", WRITES_ON], stdout=subprocess.PIPE, text=True)
        assert writer.stdout.readline() == "ready\n"
        time.sleep(after_s)
        writer.kill()
        assert writer.wait(20) == ROWS["power-lost"].exit
        writer.stdout.close()
        assert read_play("kept.play").title in ("The old", "The new")
