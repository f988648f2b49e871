"""The simulated board in C, on a real pseudo-terminal."""

import csv
import os
import select
import shutil
import signal
import subprocess
import sys
import time
from contextlib import contextmanager
from pathlib import Path

import pytest

from composer.faults import Faults
from composer.limits.abilities import abilities_of
from player.outputs import portable_board
from player.outputs.portable_board import MISHAP_OPTIONS, SOURCES, PortableBoard, compiled
from player.outputs.serial_line import SerialLine
from player.wire import messages as m
from player.wire.device_c.plant import plant_text
from player.wire.frames import FrameReader, frame
from player.wire.mishaps import MISHAPS
from player.wire.rules import TURN, Build

PATIENCE_S = 20.0
"""A busy machine may be slow: nothing here is measured by it."""


@pytest.fixture(scope="module")
def cache(tmp_path_factory):
    return tmp_path_factory.mktemp("cache")


@pytest.fixture(scope="module")
def program(cache):
    return compiled(4, cache)


class Talk:
    """A host that says one message at a time."""

    def __init__(self, path):
        self.line = SerialLine(path, 2_000_000)
        self.line.open()
        self.reader, self.heard, self.seq = FrameReader(), [], 0
        self.raw = bytearray()

    def say(self, message):
        self.seq = self.seq % 255 + 1
        self.line.write(frame(m.encode(message, self.seq)))
        return self.seq

    def listen(self, seconds):
        end = time.monotonic() + seconds
        while (left := end - time.monotonic()) > 0:
            select.select([self.line], [], [], min(left, 0.05))
            # What the terminal had no room for goes on.
            self.line.write(b"")
            data = self.line.read()
            self.raw += data
            self.heard += [(payload[1], m.decode(payload)) for payload in self.reader.feed(data)]

    def until(self, wanted, told=""):
        """Listen until something heard is as wanted; returns it."""
        end, seen = time.monotonic() + PATIENCE_S, 0
        while time.monotonic() < end:
            for seq, message in self.heard[seen:]:
                seen += 1
                if wanted(seq, message):
                    return message
            self.listen(0.01)
        raise AssertionError(f"{told or wanted} was never heard; last: {self.heard[-3:]}")

    def ask(self, message, kind=m.State):
        seq = self.say(message)
        return self.until(lambda s, answer: s == seq and isinstance(answer, kind), message)

    def armed(self, channels=4, watchdog_ms=60_000):
        self.board = self.ask(m.Hello(1), m.Board)
        self.ask(m.Configure(channels, watchdog_ms, 0x1234ABCD))
        assert self.ask(m.Arm(m.ARM_KEY)).status == m.ARMED
        return self

    def fault(self, code):
        return self.until(lambda _, said: isinstance(said, m.Faulted) and said.code == code, f"fault {code}")

    def state(self, status):
        return self.until(lambda _, said: isinstance(said, m.State) and said.status == status, m.STATUSES[status])

    def forget(self):
        """What was heard so far; what comes is new."""
        self.listen(0.1)
        self.heard.clear()
        return self


@pytest.fixture
def board(program, make_rig, tmp_path):
    """A board with options; its Talk, and rows() of its log once it has ended."""
    running = []

    @contextmanager
    def run(*options, **rig):
        rig = make_rig(4, **rig)
        text = plant_text(rig, abilities_of(rig), "main", Build("Bench", ("strain",) * 4, rig=rig.fingerprint))
        made = PortableBoard(program, text, str(tmp_path / "log.csv"), options)
        running.append(made)
        yield made, Talk(made.path)
        made.stop()
        assert made.run() == 0

    yield run
    for made in running:
        made.stop()


@pytest.fixture
def rows(tmp_path):
    return lambda: list(csv.DictReader((tmp_path / "log.csv").read_text().splitlines()))


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


# What goes wrong on purpose.


def test_every_mishap_of_the_simulated_board_can_be_had_in_c_too():
    assert set(MISHAP_OPTIONS) == set(MISHAPS)


def test_a_reset_begins_anew_vented_with_its_clock_at_0(board, rows):
    with board("--reset-after", "0.2") as (_, talk):
        talk.armed()
        talk.heard.clear()
        vented = talk.state(m.VENTED)
        states = [said for _, said in talk.heard if isinstance(said, m.State)]
        before = states[states.index(vented) - 1]
        assert before.status == m.ARMED
        assert vented.device_us < 200_000 <= before.device_us
    assert "mishap" in [row["event"] for row in rows()]


def test_a_silent_board_says_nothing_more(board):
    with board("--silent-after", "0.2") as (_, talk):
        talk.armed().listen(1.0)
        talk.forget()
        talk.say(m.Hello(1))
        talk.listen(0.5)
        assert talk.heard == []


def test_a_mute_board_hears_and_says_nothing(board, rows):
    with board("--mute") as (_, talk):
        talk.say(m.Hello(1))
        talk.listen(0.5)
        assert talk.raw == b""
    assert "vented to idle: hello" in [row["note"] for row in rows()]


def test_a_clock_jumps_ahead(board):
    with board("--jump-after", "0.3") as (_, talk):
        talk.armed()
        bounds = []
        end = time.monotonic() + 1.0
        while time.monotonic() < end:
            before_s = time.monotonic()
            board_us = talk.ask(m.Ping(1), m.Pong).device_us
            bounds.append((board_us - time.monotonic() * 1e6, board_us - before_s * 1e6))
        # Offset of the two clocks, bounded from below and above by when each answer was asked and had.
        least = bounds[-1][0] - bounds[0][1]
        most = bounds[-1][1] - bounds[0][0]
        assert 0 < least <= 100_000 <= most + 2


@pytest.mark.parametrize("ppm", [-100_000, 100_000])
def test_a_clock_runs_fast_or_slow(board, ppm):
    with board("--clock-ppm", str(ppm)) as (_, talk):
        before_s = time.monotonic()
        first = talk.ask(m.Ping(1), m.Pong).device_us
        between_s = time.monotonic()
        talk.listen(1.0)
        later_s = time.monotonic()
        passed = talk.ask(m.Ping(1), m.Pong).device_us - first
        least, most = (later_s - between_s) * (1e6 + ppm), (time.monotonic() - before_s) * (1e6 + ppm)
        assert least - 10 <= passed <= most + 10


@pytest.mark.parametrize(("option", "code"), [("--over-pressure-after", m.OVER_PRESSURE), ("--sensor-after", m.SENSOR)])
def test_it_finds_a_fault_by_itself(board, option, code):
    with board(option, "0.2") as (_, talk):
        assert talk.armed().fault(code).channel == 0
        assert talk.state(m.FAULT)


def test_a_queue_keeps_less_than_it_says(board):
    with board("--room", "1") as (_, talk):
        talk.armed()
        now = talk.ask(m.Ping(1), m.Pong).device_us
        for n in range(2):
            talk.say(m.Set((now + 40_000_000 + n) % TURN, 0, (1,)))
        assert talk.board.queue == 64
        assert talk.fault(m.QUEUE_FULL)


def test_an_echoing_line_sends_back_what_it_carries(board):
    with board("--echo") as (_, talk):
        sent = frame(m.encode(m.Ping(0x1234567), 77))
        talk.line.write(sent)
        talk.until(lambda seq, said: seq == 77 and isinstance(said, m.Pong))
        assert sent in talk.raw


@pytest.mark.parametrize(("option", "share"), [("--garble", "20"), ("--lose", "20"), ("--cut", "50")])
def test_a_line_spoils_bytes_each_way(board, option, share):
    with board(option, share) as (_, talk):
        for _ in range(300):
            talk.say(m.Ping(5))
        talk.listen(1.0)
        assert talk.reader.bad > 0
        assert talk.until(lambda _, said: isinstance(said, m.State) and said.bad > 0)


def test_a_line_begins_to_spoil_bytes_some_time_after_arming(board):
    with board("--garble", "1000", "--garble-after", "0.3") as (_, talk):
        talk.armed().listen(0.1)
        assert talk.reader.bad == 0
        talk.listen(0.6)
        talk.forget().listen(0.3)
        assert talk.raw and talk.heard == []


def test_a_command_that_makes_no_sense_is_told_and_changes_nothing(board):
    with board("--misread-after", "0.2") as (_, talk):
        assert talk.armed().fault(m.BAD_COMMAND).text == "set of a channel that is not configured"
        assert talk.forget().state(m.ARMED)


def test_answers_leave_late(board):
    with board("--late-ms", "300") as (_, talk):
        began = time.monotonic()
        talk.ask(m.Hello(1))
        assert time.monotonic() - began >= 0.3


def test_a_valve_sticks(board):
    with board("--stuck-valve-after", "0.2") as (_, talk):
        talk.armed().listen(0.6)
        talk.say(m.Set(0, 0, (65535, 65535)))
        talk.until(lambda _, said: isinstance(said, m.Sense) and said.strain[1] == 65535)
        assert all(said.strain[0] == 0 for _, said in talk.heard if isinstance(said, m.Sense))


def test_a_sensor_reads_full_stroke(board):
    with board("--railed-after", "0.2") as (_, talk):
        talk.armed()
        assert talk.until(lambda _, said: isinstance(said, m.Sense) and said.strain[0] == 65535).strain == (65535, 0, 0, 0)


def test_a_fiber_leaks(board):
    with board("--leak-after", "0.2") as (_, talk):
        talk.armed().say(m.Set(0, 0, (65535, 65535)))
        leaked = talk.until(lambda _, said: isinstance(said, m.Sense) and said.strain[1] == 65535 and said.strain[0] < 30_000)
        assert leaked.strain[0] > 0


def test_the_supply_reads_low(board):
    with board("--low-supply-after", "0.2") as (_, talk):
        talk.armed()
        assert talk.until(lambda _, said: isinstance(said, m.State) and said.supply == 3600)


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
