"""The terminal while a score plays."""

import fcntl
import os
import pty
import re
import select
import struct
import subprocess
import sys
import termios
import time
from dataclasses import replace

import pytest

from player.commands.front import KEYS_SAID, live_line
from player.engine.status import Status

STATUS = Status(
    state="playing",
    phase="playing",
    position_s=12.0,
    duration_s=61.0,
    cue="doors",
    next_cue="solo",
    waiting="",
    moving=36,
    let_down=0,
    ticks=2400,
    late_ticks=3,
    past_due=0,
    late_s=0.0,
    links=(("main", "armed"),),
)


def test_the_line_says_state_place_cues_time_left_fibers_link_and_late_ticks():
    line = live_line(STATUS, "7:2.5", colour=False, width=200)
    assert line == 'playing  bar 7:2.5  "doors"  next "solo"  49 s left  36 moving  link armed  3 late'


def test_a_waiting_cue_says_how_to_go_on():
    line = live_line(replace(STATUS, state="paused", waiting="solo"), "7:1", colour=False, width=200)
    assert line.startswith('waiting at "solo", Return goes on  bar 7:1')


def test_boards_that_differ_are_named():
    line = live_line(replace(STATUS, links=(("left", "armed"), ("right", "lost"))), "7:1", colour=False, width=200)
    assert "links left:armed right:lost" in line


def test_fibers_that_a_pause_has_let_down_are_counted():
    assert "2 let down" in live_line(replace(STATUS, let_down=2), "7:1", colour=False, width=200)


@pytest.mark.parametrize("width", [20, 40, 79])
def test_no_line_is_wider_than_the_terminal(width):
    line = live_line(STATUS, "7:2.5", colour=True, width=width)
    assert len(re.sub(r"\x1b\[[0-9]*m", "", line)) <= width


def test_without_colour_there_is_no_control_character():
    assert live_line(STATUS, "7:2.5", colour=False, width=200).isprintable()


class OnTerminal:
    """`drawcord play` on a terminal of its own; `see` waits for words, `end` gives exit code and all that was shown."""

    def __init__(self, *arguments, command="play", **environment):
        self.master, slave = pty.openpty()
        fcntl.ioctl(slave, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 120, 0, 0))
        self.process = subprocess.Popen(
            [sys.executable, "-m", "player.commands.main", command, *arguments],
            stdin=slave,
            stdout=slave,
            stderr=slave,
            start_new_session=True,
            preexec_fn=lambda: fcntl.ioctl(0, termios.TIOCSCTTY, 0),
            env={**os.environ, "TERM": "xterm", **environment},
        )
        os.close(slave)
        self.shown = ""

    def read(self):
        if not select.select([self.master], [], [], 0.1)[0]:
            return self.process.poll() is None
        try:
            self.shown += os.read(self.master, 65536).decode(errors="replace")
        except OSError:
            # Nobody has the other end open: for ever where the program has gone, for a moment where it has not.
            time.sleep(0.05)
            return self.process.poll() is None
        return True

    def see(self, words):
        end = time.monotonic() + 60.0
        while words not in self.shown and time.monotonic() < end and self.read():
            pass
        assert words in self.shown, (self.process.poll(), self.shown[-2000:])

    def type(self, keys):
        self.shown = ""
        os.write(self.master, keys)

    def end(self):
        while self.read():
            pass
        os.close(self.master)
        return self.process.wait(timeout=60)


@pytest.fixture
def score(tmp_path, monkeypatch, rig_text, score_text):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    (tmp_path / "bench.score").write_text(score_text.format(times=100, length="1.5", up="0.6", down="1.2"))
    return "bench.score"


def test_keys_pause_go_on_and_bring_to_rest(score):
    terminal = OnTerminal(score, "--to", "sim")
    terminal.see(KEYS_SAID)
    terminal.see("bar 1:")
    terminal.type(b" ")
    terminal.see("paused")
    terminal.type(b"\n")
    terminal.see("playing")
    terminal.type(b"\x03")
    terminal.see("Stopped and brought to rest")
    assert terminal.end() == 0


def test_escape_vents_and_an_arrow_key_does_not(score):
    terminal = OnTerminal(score, "--to", "sim", NO_COLOR="1")
    terminal.see("playing  bar")
    terminal.type(b"\x1b[A")
    terminal.see("playing  bar")
    terminal.type(b"\x1b")
    terminal.see("Vented at")
    assert "\x1b[3" not in terminal.shown
    assert terminal.end() == 1


def test_a_terminal_that_goes_away_brings_all_to_rest(score):
    terminal = OnTerminal(score, "--to", "file:a.rec")
    terminal.see("bar 1:")
    os.close(terminal.master)
    assert terminal.process.wait(timeout=60) in (0, 1)
    from player.outputs.recording import read

    with open("a.rec", "rb") as file:
        assert read(file.read(), "a.rec").ended == "rest"


@pytest.fixture
def board(score):
    """The port of a simulated board, behind the rig of `score`."""
    command = [sys.executable, "-m", "player.commands.main", "device", "bench.rig.toml"]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as board:
        yield board.stdout.readline().strip()
        board.terminate()


def test_a_board_is_armed_by_typing_arm(score, board):
    terminal = OnTerminal(score, "--to", f"serial:{board}")
    terminal.see("Type 'arm'")
    terminal.type(b"arm\n")
    terminal.see("bar 1:")
    terminal.type(b"\x03")
    terminal.see("Stopped and brought to rest")
    assert terminal.end() == 0


@pytest.mark.parametrize("answer", [b"no\n", b"\n", b"armed\n", b"\x04"])
def test_any_other_answer_leaves_it_disarmed(score, board, answer):
    terminal = OnTerminal(score, "--to", f"serial:{board}")
    terminal.see("Type 'arm'")
    terminal.type(answer)
    terminal.see("not armed; nothing has moved")
    assert terminal.end() == 2
