"""`drawcord live`, as it is called: with OSC over loopback, MIDI over JACK, and a terminal."""

import json
import os
import pty
import re
import select
import signal
import socket
import subprocess
import sys
import threading
import time

import numpy as np
import pytest
from pythonosc.osc_message import OscMessage
from pythonosc.udp_client import SimpleUDPClient

from composer.load import load_score
from player.commands.main import run
from player.engine.run_log import records
from player.takes.file import load_take

from .inputs.jack import Sender, is_jack_there, server, until
from .test_play_command import engine_of


@pytest.fixture
def bench(tmp_path, monkeypatch, rig_text, score_text):
    """A folder with a rig, a worn rig, a score and a map."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    worn = rig_text.replace("worn = false", "worn = true").replace("load_N = 1.5", "load_N = 1.5\nmax_hold_s = 20")
    (tmp_path / "worn.rig.toml").write_text(worn)
    (tmp_path / "bench.score").write_text(score_text.format(times=40, length="1.5", up="0.6", down="1.2"))
    (tmp_path / "bench.map.toml").write_text('[[bind]]\nmidi = { cc = 21 }\nfibers = "r.*"\n')
    return tmp_path


class Reports:
    """Hears what a session reports by OSC."""

    def __init__(self):
        self._socket = socket.socket(socket.AF_INET, socket.SOCK_DGRAM)
        self._socket.bind(("127.0.0.1", 0))
        self._socket.settimeout(30.0)
        self.port = self._socket.getsockname()[1]

    def until(self, true):
        """The first report for which something is true."""
        while True:
            message = OscMessage(self._socket.recv(8192))
            if true(message.address, message.params):
                return message

    def close(self):
        self._socket.close()


@pytest.fixture
def reports():
    made = Reports()
    yield made
    made.close()


def free_port():
    with socket.socket(socket.AF_INET, socket.SOCK_DGRAM) as one:
        one.bind(("127.0.0.1", 0))
        return one.getsockname()[1]


def started(*arguments, **more):
    """The command in a process of its own."""
    command = [sys.executable, "-m", "player.commands.main", "live", *map(str, arguments)]
    given = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE, "stdin": subprocess.DEVNULL, "text": True} | more
    return subprocess.Popen(command, **given)


def playing(address, params):
    return address == "/drawcord/state" and params[0] == "playing"


def test_a_hand_over_osc_moves_the_rig_and_its_take_is_a_score_that_checks_clean_and_plays_back(bench, reports, capsys):
    port = free_port()
    process = started(
        "bench.rig.toml", "--to", "sim", "--osc", port, "--osc-to", f"127.0.0.1:{reports.port}", "--take", "out.score",
        "--log", "out.log", "--json",
    )  # fmt: skip
    reports.until(playing)
    client = SimpleUDPClient("127.0.0.1", port)
    for value in np.sin(np.linspace(0.0, np.pi, 60)) * 0.7:
        client.send_message("/drawcord/fiber/r.2", float(value))
        time.sleep(0.01)
    client.send_message("/drawcord/arm", [])
    client.send_message("/drawcord/fiber/r.1", float("nan"))
    client.send_message("/drawcord/rest", [])
    out, err = process.communicate(timeout=60)
    told = json.loads(out)
    assert (process.returncode, told["ended"], told["state"], err) == (0, "stopped", "idle", "")
    assert told["refused"] == {"osc address": 1, "osc value": 1}
    (take,) = told["takes"]
    assert take["ok"] and take["fibers"] == 1 and take["worst"] <= 0.01
    assert run(["check", "out.score"]) == 0
    played = load_take("out.take")
    assert played.complete and float(played.strain(played.governed, 1).max()) > 0.6 * 0.3
    assert run(["play", "out.score", "--to", "sim"]) == 0
    capsys.readouterr()
    logged, left = records((bench / "out.log").read_bytes())
    kinds = [record.kind for record in logged]
    assert left == 0 and kinds.count("input") > 30 and "state" in kinds and kinds[-1] == "end"
    assert run(["report", "out.log"]) == 0


def test_being_told_to_end_brings_all_to_rest_while_a_score_plays_under_the_hands(bench, reports):
    port = free_port()
    process = started("bench.score", "--to", "sim", "--osc", port, "--osc-to", f"127.0.0.1:{reports.port}", "--json")
    reports.until(lambda address, params: playing(address, params) and params[1] > 0.3)
    process.send_signal(signal.SIGTERM)
    out, err = process.communicate(timeout=60)
    told = json.loads(out)
    assert (told["ended"], told["state"], process.returncode) == ("stopped", "idle", 0) and told["position_s"] >= 0.3
    assert err == ""


def test_a_cue_is_jumped_to_by_osc(bench, reports):
    port = free_port()
    process = started("bench.score", "--to", "sim", "--osc", port, "--osc-to", f"127.0.0.1:{reports.port}", "--json")
    reports.until(playing)
    SimpleUDPClient("127.0.0.1", port).send_message("/drawcord/cue", "middle")
    assert reports.until(lambda address, params: address == "/drawcord/cue").params[0] == "middle"
    process.send_signal(signal.SIGINT)
    process.communicate(timeout=60)


def test_a_killed_session_leaves_its_take_which_can_be_made_a_score(bench, reports, capsys):
    port = free_port()
    process = started(
        "bench.rig.toml", "--to", "sim", "--osc", port, "--osc-to", f"127.0.0.1:{reports.port}", "--take", "out.score"
    )
    reports.until(playing)
    SimpleUDPClient("127.0.0.1", port).send_message("/drawcord/fiber/r.3", 0.5)
    reports.until(lambda address, params: playing(address, params) and params[1] > 1.0)
    engine = engine_of(process)
    os.kill(engine, signal.SIGKILL)
    process.communicate()
    assert process.returncode == 1
    assert not (bench / "out.score").exists()
    assert run(["take", "out.take", "-o", "saved.score"]) == 0
    loaded = load_score("saved.score")
    capsys.readouterr()
    assert loaded.tracks.duration_s > 0.5


OSC = ("--osc", "9", "--to", "sim")


@pytest.mark.parametrize(
    "arguments,said",
    [
        (("bench.rig.toml", "--osc", "9001"), "where to?"),
        (("bench.rig.toml", "--to", "sim"), "by what hand?"),
        (("bench.rig.toml", "--follow", "clock", *OSC), "wants --midi PORT"),
        (("bench.rig.toml", "--from", "2:1", *OSC), "a rig alone has no score"),
        (("nothing.score", *OSC), "nothing.score"),
        (("bench.rig.toml", "--map", "bad.map.toml", *OSC), "bad.map.toml:3"),
        (("bench.rig.toml", "--take", "bench.rig.toml", *OSC), "bench.rig.toml"),
        (("bench.rig.toml", "--take", "nowhere/out.score", *OSC), "nowhere"),
        (("bench.rig.toml", "--osc", "here:there", "--to", "sim"), "has no port from 1 to 65535"),
        (("bench.rig.toml", "--osc", "9001", "--to", "simm"), "simm"),
        (("bench.rig.toml", "--rate", "nan", *OSC), "--rate nan"),
        (("bench.rig.toml", "--learn", "r.*"), "--learn wants"),
        (("worn.rig.toml", "--osc", "{port}", "--to", "sim"), "this rig is worn"),
    ],
)
def test_a_wrong_call_is_told_and_leaves_nothing_behind(bench, arguments, said, capsys):
    (bench / "bad.map.toml").write_text('[[bind]]\nosc = "/x"\nfibers = "rr.*"\n')
    before = sorted(path.name for path in bench.iterdir())
    assert run(["live", *(argument.format(port=free_port()) for argument in arguments)]) == 2
    assert said in capsys.readouterr().err
    assert sorted(path.name for path in bench.iterdir()) == before


class Terminal:
    """The command behind a pseudo-terminal of 80 by 24."""

    def __init__(self, *arguments, **environment):
        self.master, slave = pty.openpty()
        os.set_blocking(self.master, False)
        import fcntl
        import struct
        import termios

        fcntl.ioctl(slave, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))
        self.process = started(
            *arguments, stdin=slave, stdout=slave, stderr=slave, text=None, start_new_session=True,
            env={**os.environ, "TERM": "xterm", **environment},
            preexec_fn=lambda: fcntl.ioctl(0, termios.TIOCSCTTY, 0),
        )  # fmt: skip
        os.close(slave)
        self.shown = self.all = b""

    def until(self, text: str) -> None:
        """Read until a text has been shown since the last time; the time is only there so that a failure ends."""
        end = time.monotonic() + 40.0
        while text.encode() not in self.shown:
            assert time.monotonic() < end, self.shown[-3000:]
            ready, _, _ = select.select([self.master], [], [], 0.1)
            if ready:
                try:
                    new = os.read(self.master, 65536)
                except OSError:
                    break
                self.shown += new
                self.all += new
        assert text.encode() in self.shown, self.shown[-3000:]
        self.shown = self.shown[self.shown.index(text.encode()) + len(text) :]

    def press(self, keys: bytes) -> None:
        os.write(self.master, keys)

    def close(self) -> int:
        code = self.process.wait(60)
        os.close(self.master)
        return code


def test_the_screen_lives_and_its_keys_rest_arm_again_and_end(bench):
    terminal = Terminal("bench.rig.toml", "--to", "sim", "--osc", free_port(), NO_COLOR="1")
    terminal.until(" playing  Bench")
    assert b"r.*" in terminal.all
    assert not re.search(rb"\x1b\[[0-9;]*m", terminal.all)
    terminal.press(b"r")
    terminal.until(" idle  Bench")
    terminal.press(b"a")
    terminal.until(" playing  Bench")
    terminal.press(b"\x03")
    terminal.until("Stopped and brought to rest")
    assert terminal.close() == 0


def test_a_worn_rig_runs_while_the_key_is_held_and_comes_to_rest_when_it_is_not(bench):
    terminal = Terminal("worn.rig.toml", "--to", "sim", "--osc", free_port(), NO_COLOR="1")
    terminal.until("armed, to be held")
    for _ in range(12):
        terminal.press(b"h")
        time.sleep(0.1)
    terminal.until(" playing  Bench")
    terminal.until(" idle  Bench")
    terminal.until("let go: all comes to rest")
    terminal.press(b"\x03")
    terminal.until("Stopped and brought to rest")
    assert terminal.close() == 0


@pytest.fixture(scope="module")
def jack():
    if not is_jack_there():
        pytest.skip("needs jackd (package jackd2)")
    with server(f"drawcord-live-{os.getpid()}") as name:
        from player.inputs.midi_ports import is_midi_there

        until(is_midi_there, lambda: None)
        yield name


def test_a_fader_over_jack_moves_the_rig(jack, bench, reports):
    sender = Sender("livebox")
    process = started(
        "bench.rig.toml", "--map", "bench.map.toml", "--midi", "livebox", "--to", "sim", "--osc-to",
        f"127.0.0.1:{reports.port}", "--take", "out.score", "--json",
    )  # fmt: skip
    reports.until(playing)
    for value in (*range(0, 100, 4), *range(100, -1, -4)):
        sender.send(f"b0 15 {value:02x}")
        time.sleep(0.01)
    reports.until(lambda address, params: playing(address, params) and params[1] > 1.5)
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=60)
    sender.close()
    told = json.loads(out)
    assert err == "" and told["inputs"] >= 20 and told["takes"][0]["ok"] and told["takes"][0]["fibers"] == 4
    take = load_take("out.take")
    assert float(take.strain(take.governed, 0).max()) > 0.5 * 0.3
    assert {one[1] for one in take.inputs} == {"livebox:faders"}


def test_learn_writes_a_bind_for_the_control_that_is_moved(jack, bench):
    sender = Sender("learnbox")
    process = started("bench.rig.toml", "--map", "new.map.toml", "--midi", "learnbox", "--learn", "r.1-2", "--json")
    assert "Move the control for 'r.1-2'" in process.stderr.readline()
    for value in (10, 20, 30):
        sender.send(f"b2 07 {value:02x}")
    out, _ = process.communicate(timeout=60)
    sender.close()
    assert process.returncode == 0 and json.loads(out)["control"] == "{ cc = 7, channel = 3 }"
    assert (bench / "new.map.toml").read_text() == '[[bind]]\nmidi = { cc = 7, channel = 3 }\nfibers = "r.1-2"\npickup = true\n'


RATES = [
    (0, (24, 1), 24, (0, 0, 3, 0)),
    (1, (25, 1), 25, (0, 0, 11, 3)),
    (2, (30000, 1001), 30, (0, 0, 59, 0)),  # across a minute, of which numbers 0 and 1 are left out
    (3, (30, 1), 30, (0, 1, 5, 12)),
]


def true_seconds(label, numbers, per_s, drop):
    """Seconds that have gone when a label comes up, by counting every label from midnight on."""
    gone, at = 0, [0, 0, 0, 0]
    while tuple(at) != label:
        gone, at[3] = gone + 1, at[3] + 1
        if at[3] == numbers:
            at[3], at[2] = 0, at[2] + 1
        if at[2] == 60:
            at[2], at[1] = 0, at[1] + 1
            at[3] = 2 if drop and at[1] % 10 else 0
    return gone * per_s[1] / per_s[0]


def test_a_score_follows_time_code_of_every_rate_over_jack_coasts_and_stands_where_it_falls_silent(jack, bench, reports):
    (bench / "bench.score").write_text((bench / "bench.score").read_text().replace("times 40", "times 400"))
    sender = Sender("codebox")
    process = started(
        "bench.score", "--follow", "timecode", "--midi", "codebox", "--to", "sim", "--osc-to", f"127.0.0.1:{reports.port}"
    )
    reports.until(playing)
    for code, per_s, numbers, label in RATES:
        told = []
        ends = threading.Event()

        def listen(told=told, ends=ends):
            while not ends.is_set():
                message = reports.until(lambda address, params: address == "/drawcord/state")
                told.append((time.perf_counter(), message.params[1]))

        ear = threading.Thread(target=listen)
        ear.start()
        begin = sender.timecode(code, per_s, numbers, label, 2.0)
        time.sleep(1.2)
        ends.set()
        ear.join()
        first = true_seconds(label, numbers, per_s, code == 2)
        off = [place - first - (now - begin) for now, place in told if 0.5 < now - begin < 1.9]
        # A place is told that is in force a few ticks later, and heard when this process is let.
        assert len(off) > 10 and -0.01 < float(np.median(off)) < 0.05
        stood = [place for now, place in told if now - begin > 2.9]
        assert len(set(stood)) == 1 and stood[0] - first == pytest.approx(2.5, abs=0.1)
    process.send_signal(signal.SIGINT)
    _, err = process.communicate(timeout=60)
    sender.close()
    assert process.returncode == 0
    for rate, label in (("24", "00:00:03:00"), ("25", "00:00:11:03"), ("30 drop", "00:00:59:00"), ("30", "00:01:05:12")):
        assert f"time code {label} at {rate}: " in err
    assert err.count("time code has ended: going on for a moment") >= len(RATES)
    assert err.count("s: standing") == len(RATES)


def test_motor_faders_and_lights_over_jack_show_what_the_governor_lets_through(jack, bench, reports):
    (bench / "lit.map.toml").write_text(
        '[[bind]]\nmidi = { cc = 21 }\nfibers = "r.1-2"\npickup = true\n'
        '[[bind]]\nmidi = { note = 36 }\nphrase = "nod"\non = "r.3"\n'
    )
    score = (bench / "bench.score").read_text()
    (bench / "bench.score").write_text(score.replace("r.* nod times 40", "r.1-2 nod\n  r.4 nod after 90"))
    sender = Sender("litbox")
    process = started(
        "bench.score", "--map", "lit.map.toml", "--midi", "litbox", "--to", "sim", "--osc-to",
        f"127.0.0.1:{reports.port}", "--json",
    )  # fmt: skip
    reports.until(playing)
    heard = []
    while not (heard and heard[-1] == "B0 15 00" and "B0 15 7F" in heard):
        heard.append(sender.heard())
    faders = [int(message.split()[2], 16) for message in heard if message.startswith("B0 15")]
    top = faders.index(127)
    assert top > 3 and faders[: top + 1] == sorted(faders[: top + 1]) and faders[top:] == sorted(faders[top:], reverse=True)
    assert {message for message in heard if not message.startswith("B0 15")} <= {"90 24 00"}
    sender.send("90 24 7f")
    assert sender.heard() == "90 24 7F"
    assert sender.heard() == "90 24 00"
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=60)
    sender.close()
    assert (process.returncode, err) == (0, ""), out
