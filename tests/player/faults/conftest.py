"""A board in C on a pseudo-terminal, and players in processes of their own, with a terminal of theirs or without."""

import csv
import fcntl
import json
import os
import pty
import select
import signal
import struct
import subprocess
import sys
import termios
import time
from contextlib import suppress
from pathlib import Path

import pytest

from composer.limits.abilities import abilities_of
from composer.load import load_rig
from player.engine.run_log import records
from player.outputs.portable_board import MISHAP_OPTIONS, PortableBoard, compiled
from player.wire.device_c.plant import plant_text
from player.wire.mishaps import MISHAPS, Mishap
from player.wire.rules import Build
from player.wire.simulated import Bench

PATIENCE_S = 60.0
MAIN = [sys.executable, "-m", "player.commands.main"]
RIG, SCORE = "bench.rig.toml", "bench.score"
NAME = "A board behind the stage, on the left, of four fibers that are sensed"
"""So long that no hello gets through where one byte in ten is another one."""
RATE = ("--rate", "100")
PIECE = """title "Bench piece"
rig bench.rig.toml
tempo 120
phrase nod {length}
  0 rest
  1 full
  {down} full
  {length} rest
section only at 1:1
  r.* nod
"""


class Stage:
    """A board and players in a folder, all ended at the end; `port` is the board's."""

    def __init__(self, program, folder, rig):
        self._program, self.folder = program, folder
        (folder / RIG).write_text(rig)
        self.score(4)
        self._started = []
        self._pipes = []
        self.device = None
        self.port = ""

    def score(self, counts):
        """A score that goes up in half a second, holds, and is at rest again after so many counts of half a second."""
        (self.folder / SCORE).write_text(PIECE.format(length=counts, down=counts - 1))

    def board(self, mishap="", after_s=0.6):
        """A board, which goes wrong so long after arming where the mishap is one that strikes; returns its port."""
        rig = load_rig(str(self.folder / RIG))
        abilities = abilities_of(rig)
        drives = Bench(rig, abilities, "main").drives[: len(rig.fibers)]
        build = Build(NAME, drives, senses_strain=True, senses_supply=True, rig=rig.fingerprint)
        row = MISHAPS[mishap] if mishap else Mishap("")
        options = list(MISHAP_OPTIONS.get(mishap, ()))
        for place, option in enumerate(options):
            if option.endswith("-after"):
                options[place + 1] = str(after_s)
        text = plant_text(rig, abilities, "main", row.build(build))
        self.device = PortableBoard(self._program, text, str(self.folder / "board.csv"), tuple(options))
        self.port = self.device.path
        return self.port

    def play(self, *more, log="run.log", **kept):
        """A player without a terminal, armed by its call, that prints JSON."""
        call = [*MAIN, "play", SCORE, "--to", f"serial:{self.port}", "--arm", "--json", "--log", log, *RATE, *more]
        pipes = {
            "stdin": subprocess.DEVNULL,
            "stdout": subprocess.PIPE,
            "stderr": subprocess.PIPE,
            "text": True,
            "cwd": self.folder,
        }
        return self._keep(subprocess.Popen(call, **pipes, **kept))

    def terminal(self, *more):
        """A player on a terminal of its own."""
        call = [*MAIN, "play", SCORE, "--to", f"serial:{self.port}", "--log", "run.log", *RATE, *more]
        terminal = Terminal(call, self.folder)
        self._keep(terminal.process)
        self._pipes.append(terminal)
        return terminal

    def _keep(self, process):
        self._started.append(process)
        return process

    def players(self, process):
        """The processes of a player: the one that was started, and whichever beside the board holds the port."""
        return {process.pid} | _holders(self.port) - {self.device._process.pid, os.getpid()}

    def signal(self, process, *numbers, pause_s=0.0):
        """Signals to every process of a player, one after another with a pause between them."""
        players = self.players(process)
        for place, number in enumerate(numbers):
            time.sleep(pause_s if place else 0.0)
            for pid in players:
                os.kill(pid, number)

    def rows(self):
        """The board's log as rows."""
        return list(csv.DictReader((self.folder / "board.csv").read_text().splitlines()))

    def board_says(self, words):
        """Wait until the board's log says something."""
        end = time.monotonic() + PATIENCE_S
        while time.monotonic() < end:
            if any(words in row["note"] for row in self.rows() if row["note"]):
                return
            time.sleep(0.02)
        raise AssertionError(f"the board never said {words!r}: {self.statuses()}")

    def statuses(self):
        """Changes of the board's status, in order."""
        rows = [row for row in self.rows() if row["event"] == "status" or row["note"].startswith("starts anew")]
        return [row["note"] for row in rows]

    def shut(self):
        """Nothing is left open: the board, which is still there, is no longer armed, and moves nothing more."""
        end = time.monotonic() + PATIENCE_S
        while self.statuses() and " to armed" in self.statuses()[-1] and time.monotonic() < end:
            time.sleep(0.02)
        assert not self.statuses() or " to armed" not in self.statuses()[-1], self.statuses()
        assert self.device._process.poll() is None

    def end(self):
        for process in self._started:
            for pid in self.players(process) if process.poll() is None else _holders(self.port) - {self.device._process.pid}:
                if pid != os.getpid():
                    os.kill(pid, signal.SIGCONT)
                    os.kill(pid, signal.SIGKILL)
            process.wait(PATIENCE_S)
            for pipe in (process.stdout, process.stderr):
                if pipe is not None:
                    pipe.close()
        for pipe in self._pipes:
            pipe.close()
        if self.device is not None:
            self.device.stop()
            self.device._process.wait(PATIENCE_S)
            self.device._process.stdout.close()


class Terminal:
    """A program on a terminal of its own; `see` waits for words, `end` gives exit code and all that was shown."""

    def __init__(self, call, folder):
        self.master, slave = pty.openpty()
        fcntl.ioctl(slave, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 200, 0, 0))
        self.process = subprocess.Popen(
            call,
            stdin=slave,
            stdout=slave,
            stderr=slave,
            start_new_session=True,
            cwd=folder,
            preexec_fn=lambda: fcntl.ioctl(0, termios.TIOCSCTTY, 0),
            env={**os.environ, "TERM": "xterm", "NO_COLOR": "1"},
        )
        os.close(slave)
        self.shown = self.all = ""

    def _read(self):
        if not select.select([self.master], [], [], 0.05)[0]:
            return self.process.poll() is None
        try:
            data = os.read(self.master, 65536).decode(errors="replace")
        except OSError:
            return False
        self.shown += data
        self.all += data
        return True

    def see(self, words):
        end = time.monotonic() + PATIENCE_S
        while words not in self.shown and time.monotonic() < end and self._read():
            pass
        assert words in self.shown, self.all[-3000:]
        return self

    def type(self, keys):
        self.shown = ""
        os.write(self.master, keys)
        return self

    def end(self):
        while self._read():
            pass
        return self.process.wait(PATIENCE_S), self.all

    def close(self):
        os.close(self.master)


def urgent():
    """Where it is permitted: what else the machine does, other tests too, is to be no fault of its own."""
    with suppress(OSError):
        os.nice(-10)


def _holders(port):
    """Processes that hold a port."""
    found = set()
    for pid in filter(str.isdigit, os.listdir("/proc")):
        try:
            held = {os.readlink(f"/proc/{pid}/fd/{handle}") for handle in os.listdir(f"/proc/{pid}/fd")}
        except OSError:
            continue
        if port and port in held:
            found.add(int(pid))
    return found


@pytest.fixture(scope="session")
def board_program():
    """The board in C, for up to 8 channels."""
    return compiled(8)


@pytest.fixture
def make_stage(board_program, tmp_path, rig_text):
    """A maker of stages, each in a folder of its own."""
    made = []

    def make(name):
        folder = tmp_path / name
        folder.mkdir()
        made.append(Stage(board_program, folder, rig_text))
        return made[-1]

    yield make
    for stage in made:
        stage.end()


@pytest.fixture
def stage(make_stage, monkeypatch):
    """One stage, in the present folder."""
    stage = make_stage("stage")
    monkeypatch.chdir(stage.folder)
    return stage


@pytest.fixture
def moving():
    def wait(path="run.log", size=5_000):
        """Wait until the fibers move."""
        end = time.monotonic() + PATIENCE_S
        while time.monotonic() < end:
            if os.path.exists(path) and os.path.getsize(path) > size:
                return
            time.sleep(0.02)
        raise AssertionError("the run did not begin")

    return wait


@pytest.fixture
def whole():
    def read(path="run.log", cut=False):
        """The log's records; it must be whole up to where it ends, which is in mid-record only where the run was cut off."""
        found, left = records(Path(path).read_bytes())
        assert found[0].kind == "head" and (left == 0 or cut)
        return found

    return read


@pytest.fixture
def ended_as():
    def check(stage, row, playing):
        """Hold the end of a run against its row; returns the report, None where nothing was armed."""
        out, err = playing.communicate(timeout=PATIENCE_S)
        assert playing.returncode == row.exit, (out, err)
        stage.shut()
        if not row.state:
            assert row.told in err and row.then in err and out == ""
            return None
        told = json.loads(out)
        said = [fault["say"] for fault in told["faults"]]
        assert told["state"] in row.state.split(" or ") and told["ended"] == row.ended, told
        assert bool(said) == bool(row.exit), said
        # One sentence says what has happened and what to do.
        heard = [any(words in one for words in row.told.split(" / ")) for one in said]
        helped = [any(words in one for words in row.then.split(" / ")) for one in said]
        assert not said or any(both == (True, True) for both in zip(heard, helped, strict=True)), said
        return told

    return check
