"""The simulated board in C, on a real pseudo-terminal."""

import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from composer.faults import Faults
from composer.limits.abilities import abilities_of
from player.outputs import portable_board
from player.outputs.portable_board import SOURCES, compiled
from player.wire import messages as m
from player.wire.device_c.plant import plant_text
from player.wire.rules import TURN, Build

from .portable import PATIENCE_S, Talk


def test_it_compiles_without_a_warning(tmp_path):
    sources = [*SOURCES.glob("*.c"), *(SOURCES / "posix").glob("*.c")]
    compiler = shutil.which("gcc") or shutil.which("cc")
    call = [compiler, "-std=c99", "-pedantic", "-Wall", "-Wextra", "-Werror", "-O2", f"-I{SOURCES}"]
    done = subprocess.run(
        [*call, *map(str, sources), "-lpthread", "-o", str(tmp_path / "board")], capture_output=True, text=True, timeout=120
    )
    assert (done.returncode, done.stderr) == (0, "")


def test_it_answers_as_the_rig_says(board):
    with board() as (_, talk):
        answer = talk.ask(m.Hello(1), m.Board)
        assert (answer.flags, answer.channels, answer.queue, answer.name) == (3, 4, 64, "Bench")
        assert talk.ask(m.Configure(4, 1000, 1)).status == m.FAULT
        assert talk.fault(m.RIG_MISMATCH)


def test_every_set_is_in_its_log_applied_in_order_and_never_before_its_time(board, rows):
    with board() as (_, talk):
        talk.armed()
        now = talk.ask(m.Ping(1), m.Pong).device_us
        dues = [(now + 1_000_000 + 3000 * n) % TURN for n in range(60)]
        for n, due in enumerate(dues):
            talk.say(m.Set(due, n % 4, (1000 * n,)))
        talk.until(lambda _, said: isinstance(said, m.State) and said.queued > 0)
        talk.forget()
        talk.until(lambda _, said: isinstance(said, m.State) and said.queued == 0)
    sets = [row for row in rows() if row["event"] == "set"]
    assert [int(row["due_us"]) for row in sets] == dues
    assert [(int(row["first"]), int(row["count"])) for row in sets] == [(n % 4, 1) for n in range(60)]
    assert all(int(row["late_us"]) == int(row["applied_us"]) - int(row["due_us"]) >= 0 for row in sets)
    assert [row["note"] for row in rows() if row["event"] == "status"][:2] == ["vented to idle: hello", "idle to armed: arm"]
    assert rows()[-1]["event"] == "end"


def test_a_set_that_comes_past_its_time_is_late_in_log_and_state(board, rows):
    with board() as (_, talk):
        talk.armed()
        talk.say(m.Set((talk.ask(m.Ping(1), m.Pong).device_us - 5000) % TURN, 0, (7,)))
        assert talk.until(lambda _, said: isinstance(said, m.State) and said.late)
    assert [row["note"] for row in rows() if row["event"] == "set"] == ["late"]


def test_a_set_due_sooner_than_the_one_that_is_waited_for_is_not_kept_waiting(board, rows):
    with board() as (_, talk):
        talk.armed()
        now = talk.ask(m.Ping(1), m.Pong).device_us
        talk.say(m.Set((now + 3_000_000) % TURN, 0, (1,)))
        talk.say(m.Set((now + 800_000) % TURN, 1, (2,)))
        talk.listen(1.2)
        talk.ask(m.Vent())
    sets = [row for row in rows() if row["event"] == "set"]
    assert [int(row["first"]) for row in sets] == [1]


def test_it_outlives_hosts_that_come_and_go(board):
    with board() as (made, talk):
        talk.armed()
        talk.line.close()
        again = Talk(made.path)
        assert again.armed().board.name == "Bench"


def test_a_host_that_is_silent_finds_it_vented(board):
    with board() as (_, talk):
        talk.armed(watchdog_ms=100)
        assert talk.fault(m.WATCHDOG)
        assert talk.state(m.VENTED)


def test_garbage_leaves_it_able_to_answer(board):
    with board() as (_, talk):
        talk.line.write(bytes(range(256)) * 100 + b"\0")
        assert talk.ask(m.Hello(1)).bad > 0


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM, signal.SIGHUP])
def test_a_signal_ends_it_with_every_channel_vented(board, rows, number):
    with board() as (made, talk):
        talk.armed()
        os.kill(made._process.pid, number)
        assert made.run() == 0
    assert rows()[-1]["note"] == "every channel vented"


def test_it_ends_with_the_process_that_started_it(program, make_rig, tmp_path):
    rig = make_rig(4)
    (tmp_path / "plant").write_text(plant_text(rig, abilities_of(rig), "main", Build("B", ("strain",) * 4)))
    script = (
        "import os, subprocess, sys\n"
        "board = subprocess.Popen([*sys.argv[1:], '--parent', str(os.getpid())], stdout=subprocess.PIPE)\n"
        "board.stdout.readline()\n"
        "print(board.pid, flush=True)\n"
        "input()\n"
    )
    call = [sys.executable, "-c", script, str(program), "--plant", str(tmp_path / "plant"), "--log", str(tmp_path / "log.csv")]
    parent = subprocess.Popen(call, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
    parent.stdout.readline()
    parent.kill()
    parent.communicate(timeout=PATIENCE_S)
    end = time.monotonic() + PATIENCE_S
    while "every channel vented" not in (tmp_path / "log.csv").read_text():
        assert time.monotonic() < end
        time.sleep(0.05)


def test_fibers_move_draw_air_and_are_sensed(board):
    with board(air_mL=3000.0, compressor_L_min=1.0) as (_, talk):
        talk.armed()
        talk.say(m.Set(0, 1, (65535,)))
        full = talk.until(lambda _, said: isinstance(said, m.Sense) and said.strain[1] == 65535)
        assert full.strain == (0, 65535, 0, 0)
        assert talk.until(lambda _, said: isinstance(said, m.State) and said.supply < 7750).supply > 7650


@pytest.mark.parametrize(
    "options", [("--unknown", "1"), ("--room",), ("--room", "65"), ("--garble", "x"), ("--leak-after", "-1")]
)
def test_an_option_that_is_none_ends_it_at_once(program, options):
    done = subprocess.run([program, *options], capture_output=True, text=True, timeout=PATIENCE_S)
    assert (done.returncode, done.stdout) == (2, "")
    assert done.stderr.startswith((options[0], options[-1]))


# Compiling.


def test_what_is_compiled_already_is_found_again(program, cache, monkeypatch):
    monkeypatch.setattr(subprocess, "run", None)
    assert compiled(4, cache) == program
    assert list(cache.iterdir()) == [program]


def test_another_number_of_channels_is_another_program(program, cache, tmp_path):
    assert compiled(5, tmp_path).name != program.name


def test_without_a_compiler_it_says_what_to_do(cache, monkeypatch):
    monkeypatch.setattr(portable_board.shutil, "which", lambda name: None)
    with pytest.raises(Faults, match="no C compiler on this machine") as caught:
        compiled(4, cache)
    assert "leave --portable out" in str(caught.value)


def test_a_compiler_that_fails_leaves_nothing_behind(tmp_path, monkeypatch):
    monkeypatch.setattr(portable_board, "FLAGS", ("-no-such-flag-at-all",))
    with pytest.raises(Faults, match="does not compile the board"):
        compiled(4, tmp_path)
    assert list(tmp_path.iterdir()) == []


def test_a_cache_that_is_no_folder_is_a_fault(tmp_path):
    (tmp_path / "cache").write_text("")
    with pytest.raises(Faults, match="the compiled board cannot be kept there"):
        compiled(4, tmp_path / "cache")


def test_the_sources_travel_with_the_package():
    assert {path.name for path in SOURCES.rglob("*.[ch]")} >= {"device.c", "device.h", "frames.c", "frames.h", "board.c"}
    assert Path(portable_board.__file__).parents[1] in SOURCES.parents
