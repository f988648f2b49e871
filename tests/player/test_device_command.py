import csv
import os
import select
import signal
import subprocess
import sys
import time
from contextlib import contextmanager
from itertools import pairwise

import pytest

from composer.load import load_rig
from player.commands.main import run
from player.outputs.serial_line import SerialLine
from player.wire import link
from player.wire import messages as m
from player.wire.frames import frame
from player.wire.host import Host
from player.wire.mishaps import MISHAPS


@pytest.fixture
def rig(tmp_path, small_rig):
    path = tmp_path / "bench.rig.toml"
    path.write_text(small_rig())
    return str(path)


@pytest.fixture
def rig_of_two(tmp_path, small_rig):
    path = tmp_path / "two.rig.toml"
    path.write_text(small_rig(rows=(("l", "left"), ("r", "right"))))
    return str(path)


@contextmanager
def device(*arguments, env=None):
    """The command as a process of its own; yields it and the path it prints."""
    call = [sys.executable, "-c", "from player.commands.main import main; main()", "device", *arguments]
    process = subprocess.Popen(call, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=env)
    try:
        yield process, process.stdout.readline().strip()
    finally:
        if process.poll() is None:
            process.send_signal(signal.SIGTERM)
        process.communicate(timeout=20)


@pytest.fixture(scope="session", params=["python", "portable"])
def start(request, tmp_path_factory):
    """The command with each of its boards: the one in Python and the one in C."""
    if request.param == "python":
        return device
    cache = str(tmp_path_factory.mktemp("cache"))
    return lambda *arguments: device(*arguments, "--portable", env={**os.environ, "XDG_CACHE_HOME": cache})


class Played:
    """A host on a real line."""

    def __init__(self, path, rig, channels=4, **host):
        self.line = SerialLine(path, 2_000_000)
        self.line.open()
        # A busy machine may hold a test up: only the test of the watchdog wants it tight.
        self.host = Host(channels, load_rig(rig).fingerprint, **{"watchdog_ms": 3000, **host})
        self.events = []

    def go(self, seconds, until=()):
        end = time.monotonic() + seconds
        while time.monotonic() < end and self.host.state not in until:
            now = time.monotonic()
            self.events += self.host.receive(self.line.read(), now) + self.host.tick(now)
            self.line.write(self.host.to_send())
            select.select([self.line], [], [], 0.001)
        return self

    def armed(self):
        self.host.open(time.monotonic())
        self.go(20.0, ("ready", "failed"))
        assert self.host.arm(time.monotonic()), self.events
        self.go(10.0, ("armed", "failed"))
        assert self.host.state == "armed"
        return self

    def rested(self):
        self.host.rest(0.1, time.monotonic())
        return self.go(5.0, ("ready", "failed", "vented"))

    def close(self):
        self.line.close()


def rows(log):
    with open(log, newline="") as file:
        return list(csv.DictReader(file))


def test_sets_sent_ahead_are_each_in_the_log_with_their_due_time_and_none_is_late(rig, tmp_path, start):
    log = tmp_path / "log.csv"
    with start(rig, "--log", str(log)) as (_, path):
        played = Played(path, rig).armed()
        played.go(0.5)
        begin = time.monotonic() + 1.0
        for n in range(50):
            assert played.host.set(begin + 0.004 * n, 0, [n * 1000] * 4, time.monotonic())
        played.go(1.7)
        assert played.host.late == 0
        assert any(max(event.strain) > 0 for event in played.events if isinstance(event, link.Sensed))
        assert played.host.supply_kPa == pytest.approx(800.0, abs=20.0)
        played.rested()
        assert played.host.state == "ready"
        played.close()
    told = rows(log)
    sets = [row for row in told if row["event"] == "set"]
    assert len(sets) == 50
    dues = [int(row["due_us"]) for row in sets]
    assert [b - a for a, b in pairwise(dues)] == pytest.approx([4000] * 49, abs=50)
    assert all(int(row["arrival_us"]) < int(row["due_us"]) <= int(row["applied_us"]) for row in sets)
    assert all(int(row["late_us"]) == int(row["applied_us"]) - int(row["due_us"]) for row in sets)
    assert [row["note"] for row in told if row["event"] == "status"] == [
        "vented to idle: hello",
        "idle to armed: arm",
        "armed to idle: at rest",
    ]
    assert told[-1]["note"] == "every channel vented"


def test_a_player_that_is_gone_leaves_a_vented_board_that_the_next_one_can_play(rig, tmp_path, start):
    log = tmp_path / "log.csv"
    with start(rig, "--log", str(log)) as (_, path):
        first = Played(path, rig, watchdog_ms=150).armed()
        first.host.set(time.monotonic(), 0, [60000] * 4, time.monotonic())
        first.go(0.1)
        first.close()
        time.sleep(0.6)
        assert any(row["event"] == "fault" and row["note"].startswith("1 watchdog") for row in rows(log))
        assert any(row["note"] == "armed to vented: watchdog" for row in rows(log))
        second = Played(path, rig).armed()
        second.rested()
        assert second.host.state == "ready"
        second.close()


@pytest.mark.parametrize("how", [signal.SIGINT, signal.SIGTERM])
def test_a_signal_ends_it_with_everything_vented_and_exit_code_0(rig, tmp_path, how, start):
    log = tmp_path / "log.csv"
    with start(rig, "--log", str(log)) as (process, path):
        played = Played(path, rig).armed()
        process.send_signal(how)
        assert process.wait(timeout=10) == 0
        assert rows(log)[-1]["event"] == "end"
        assert not os.path.exists(path)
        played.close()


def test_a_log_is_whole_up_to_the_last_line_when_the_board_is_killed(rig, tmp_path, start):
    log = tmp_path / "log.csv"
    with start(rig, "--log", str(log)) as (process, path):
        Played(path, rig).armed().close()
        process.kill()
        process.wait(timeout=10)
        end = time.monotonic() + 10.0
        while len(rows(log)) < 2 and time.monotonic() < end:
            time.sleep(0.01)
    assert [row["note"] for row in rows(log)][:2] == ["vented to idle: hello", "idle to armed: arm"]
    assert log.read_text().endswith("\n")


def test_a_board_that_nobody_reads_goes_on_and_answers_the_next_player(rig, start):
    with start(rig) as (_, path):
        handle = os.open(path, os.O_RDWR | os.O_NOCTTY)
        for _ in range(300):
            os.write(handle, frame(m.encode(m.Ping(1), 1)) * 20)
        time.sleep(0.3)
        os.close(handle)
        played = Played(path, rig).armed()
        played.close()


def test_a_wrong_rig_is_refused_by_the_simulated_board(rig, rig_of_two, start):
    with start(rig) as (_, path):
        played = Played(path, rig_of_two)
        played.host.open(time.monotonic())
        played.go(10.0, ("ready", "failed"))
        assert played.host.state == "failed"
        assert "rig mismatch" in [event.why for event in played.events if isinstance(event, link.Moved)][-1]
        played.close()


@pytest.mark.parametrize(("name", "ends_in"), [("resets", "vented"), ("over-pressure", "failed"), ("jumping-clock", "failed")])
def test_a_mishap_that_strikes_ends_the_run(rig, name, ends_in, start):
    with start(rig, "--fault", name) as (_, path):
        played = Played(path, rig).armed()
        played.go(10.0, ("vented", "failed"))
        assert played.host.state == ends_in or (name == "resets" and played.host.state == "failed")
        played.close()


def test_a_board_that_falls_silent_is_told_as_silent(rig, start):
    with start(rig, "--fault", "silent") as (_, path):
        played = Played(path, rig).armed()
        end = time.monotonic() + 10.0
        while time.monotonic() < end and not any(isinstance(event, link.Silent) for event in played.events):
            played.go(0.05)
        assert any(isinstance(event, link.Silent) for event in played.events)
        assert played.host.state == "armed"
        played.close()


@pytest.mark.parametrize("name", ["garbles", "loses", "late-answers", "slow-clock", "fast-clock"])
def test_a_board_that_is_only_bad_is_armed_and_rested_all_the_same(rig, name, start):
    with start(rig, "--fault", name) as (_, path):
        played = Played(path, rig, reply_s=0.3, tries=30, watchdog_ms=2000).armed()
        played.go(0.5)
        played.rested()
        assert played.host.state == "ready"
        played.close()


def test_a_queue_that_is_smaller_than_it_says_answers_fault_5(rig, start):
    with start(rig, "--fault", "full-queue") as (_, path):
        played = Played(path, rig).armed()
        now = time.monotonic()
        played.host.set(now + 0.2, 0, [1] * 4, now)
        played.host.set(now + 0.3, 0, [2] * 4, now)
        played.go(0.4)
        assert m.QUEUE_FULL in [event.code for event in played.events if isinstance(event, link.Trouble)]
        played.close()


def test_a_rig_of_two_boards_asks_which_and_each_runs_as_its_own_process(rig_of_two, capsys, start):
    assert run(["device", rig_of_two]) == 2
    said = capsys.readouterr().err
    assert "the rig has 2 boards: left, right" in said
    assert "--driver NAME" in said
    with (
        start(rig_of_two, "--driver", "left") as (_, left),
        start(rig_of_two, "--driver", "right", "--name", "Own") as (_, right),
    ):
        assert left != right
        boards = [Played(left, rig_of_two).armed(), Played(right, rig_of_two).armed()]
        assert [board.host.board.name for board in boards] == ["Bench left, simulated", "Own"]
        assert run(["ports"]) == 0
        listed = capsys.readouterr().out
        assert left in listed
        assert right in listed
        for board in boards:
            board.close()
    assert run(["ports"]) == 0
    assert "Bench left, simulated" not in capsys.readouterr().out


def test_a_driver_that_is_none_offers_the_nearest(rig_of_two, capsys):
    assert run(["device", rig_of_two, "--driver", "lefft"]) == 2
    assert "no driver 'lefft'; expected one of left, right\n   did you mean 'left'?" in capsys.readouterr().err


def test_an_unknown_fault_lists_all_of_them(rig, capsys):
    assert run(["device", rig, "--fault", "silence"]) == 2
    said = capsys.readouterr().err
    assert "no fault 'silence'. did you mean 'silent'?" in said
    assert all(f"{name:<14} {mishap.says}" in said for name, mishap in MISHAPS.items())


def test_a_log_that_cannot_be_written_is_told_before_anything_starts(rig, tmp_path, capsys):
    assert run(["device", rig, "--log", str(tmp_path / "no" / "log.csv")]) == 2
    assert "the log cannot be written: No such file or directory" in capsys.readouterr().err


def test_a_name_that_a_hello_could_not_carry_is_refused(rig, capsys):
    assert run(["device", rig, "--name", "x" * 256]) == 2
    assert "a name of at most 255 bytes" in capsys.readouterr().err


def test_a_rig_that_is_not_there_is_told(tmp_path, capsys):
    assert run(["device", str(tmp_path / "none.rig.toml")]) == 2
    assert "none.rig.toml" in capsys.readouterr().err


def test_a_portable_board_without_a_compiler_says_what_to_do(rig, tmp_path, capsys, monkeypatch):
    monkeypatch.setenv("PATH", str(tmp_path))
    assert run(["device", rig, "--portable"]) == 2
    said = capsys.readouterr().err
    assert "--portable: no C compiler on this machine" in said
    assert "leave --portable out" in said


@pytest.mark.parametrize(
    ("option", "value"), [("--name", "x" * 256), ("--name", "two\nlines"), ("--log", "no/such/folder/log.csv")]
)
def test_what_a_portable_board_cannot_take_is_told_before_anything_is_compiled(
    rig, tmp_path, capsys, monkeypatch, option, value
):
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "cache"))
    assert run(["device", rig, "--portable", option, value]) == 2
    assert capsys.readouterr().err.startswith((option, value))
    assert not (tmp_path / "cache").exists()
