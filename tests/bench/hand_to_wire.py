"""From a hand to the wire: how long after a control has moved the first frame that moves a valve leaves, and a session's ticks.

A fader (a process of its own, over JACK's dummy driver) or an OSC sender (over loopback) jumps; between the session and its
board, the simulated one in C or in Python, lies a tap that reads what is sent. Printed: the distribution of the latency in ms,
beside one tick plus 2 ms, how late the session's ticks were, and what it says of its board.

    python tests/bench/hand_to_wire.py [midi|osc] [--jumps 150] [--python-board]
"""

import argparse
import json
import os
import pty
import random
import select
import signal
import socket
import subprocess
import sys
import tempfile
import threading
import time
import tty
from contextlib import ExitStack, suppress
from pathlib import Path

import numpy as np
from pythonosc.udp_client import SimpleUDPClient

sys.path.insert(0, str(Path(__file__).parents[1] / "player" / "inputs"))
sys.path.insert(0, str(Path(__file__).parents[1]))

from conftest import small_rig
from jack import Sender, server, until

from player.inputs.midi_ports import is_midi_there
from player.wire.frames import FrameReader
from player.wire.messages import Set, decode

TICK_S, ROOM_S = 0.005, 0.002
LOW, HIGH = 25, 100
SENDS, JACK, TAP = 5, 15, 30
"""Real-time priorities: of what sends, of JACK, as those who play by it have it, and of the tap."""

FRAMES = 48
"""Of a period of JACK, a millisecond: a message waits for the next to begin."""

MAP = '[[bind]]\nmidi = { cc = 21 }\nfibers = "r.*"\n[[bind]]\nosc = "/fader"\nfibers = "r.*"\n'


class Tap:
    """A serial line between player and board that notes when a set with new values for a valve passes."""

    def __init__(self, board: str):
        self._board = os.open(board, os.O_RDWR | os.O_NOCTTY)
        self._player, slave = pty.openpty()
        tty.setraw(self._board)
        tty.setraw(slave)
        self.path = os.ttyname(slave)
        self._slave, self._frames = slave, FrameReader()
        self._values: dict[int, tuple] = {}
        self.changes: list[float] = []
        self._ends = threading.Event()
        self._thread = threading.Thread(target=self._run, daemon=True)
        self._thread.start()

    def close(self) -> None:
        self._ends.set()
        self._thread.join()
        for handle in (self._board, self._player, self._slave):
            os.close(handle)

    def _run(self) -> None:
        with suppress(AttributeError, OSError):
            # As a line is: nothing holds it up.
            os.sched_setscheduler(0, os.SCHED_FIFO, os.sched_param(TAP))
        while not self._ends.is_set():
            ready, _, _ = select.select([self._board, self._player], [], [], 0.05)
            now = time.perf_counter()
            for handle, other in ((self._player, self._board), (self._board, self._player)):
                if handle in ready:
                    data = os.read(handle, 65536)
                    if handle == self._player:
                        self._note(data, now)
                    os.write(other, data)

    def _note(self, data: bytes, now: float) -> None:
        for payload in self._frames.feed(data):
            message = decode(payload)
            message = message[0] if isinstance(message, tuple) else message
            if isinstance(message, Set):
                if self._values.get(message.first, message.value) != message.value:
                    self.changes.append(now)
                self._values[message.first] = message.value


def main() -> None:
    """One of the two ways in, or both."""
    parser = argparse.ArgumentParser()
    parser.add_argument("way", nargs="?", choices=("midi", "osc"))
    parser.add_argument("--jumps", type=int, default=150)
    parser.add_argument("--python-board", action="store_true")
    options = parser.parse_args()
    # Not the bench is to be measured: it, the board and what sends go before all else, as the session does by itself.
    try:
        os.sched_setscheduler(0, os.SCHED_FIFO, os.sched_param(SENDS))
        jack = JACK
    except (AttributeError, OSError):
        jack = 0
        print("no real-time priority is permitted here: what else the machine does is measured too")
    for way in (options.way,) if options.way else ("midi", "osc"):
        bench(way, options.jumps, not options.python_board, jack)


def bench(way: str, jumps: int, portable: bool, jack: int) -> None:
    """Jumps by one way in, and what came of them; jack: priority of its server, 0 for none."""
    with ExitStack() as stack:
        folder = stack.enter_context(tempfile.TemporaryDirectory())
        rig = small_rig.__wrapped__()(
            channels=8, rest_length_mm=800, fill_rate_per_s=6.0, exhaust_rate_per_s=6.0, C_dm3_s_bar=0.02
        )
        (Path(folder) / "bench.rig.toml").write_text(rig)
        (Path(folder) / "hand.map.toml").write_text(MAP)
        command = [sys.executable, "-m", "player.commands.main"]
        board = ["device", "bench.rig.toml", *(["--portable"] if portable else [])]
        device = subprocess.Popen([*command, *board], cwd=folder, stdout=subprocess.PIPE, text=True)
        stack.callback(device.wait)
        stack.callback(device.terminate)
        tap = Tap(device.stdout.readline().strip())
        stack.callback(tap.close)
        live = ["live", "bench.rig.toml", "--map", "hand.map.toml", "--to", f"serial:{tap.path}", "--json", "--arm"]
        if way == "midi":
            stack.enter_context(server(f"drawcord-bench-{os.getpid()}", FRAMES, jack))
            until(is_midi_there, lambda: None)
            sender = Sender("benchbox")
            stack.callback(sender.close)
            live += ["--midi", "benchbox"]
            send = lambda value: sender.send(f"b0 15 {value:02x}")  # noqa: E731
        else:
            with socket.socket(socket.AF_INET, socket.SOCK_DGRAM) as free:
                free.bind(("127.0.0.1", 0))
                port = free.getsockname()[1]
            client = SimpleUDPClient("127.0.0.1", port)
            live += ["--osc", str(port)]
            send = lambda value: client.send_message("/fader", value / 127)  # noqa: E731
        session = subprocess.Popen([*command, *live], cwd=folder, stdout=subprocess.PIPE, stdin=subprocess.DEVNULL, text=True)
        time.sleep(4.0)
        took, missed, chance = [], 0, random.Random(6)
        for number in range(jumps):
            time.sleep(0.35 + chance.uniform(0.0, 2.0 * TICK_S))
            tap.changes.clear()
            begun = time.perf_counter()
            send(HIGH if number % 2 == 0 else LOW)
            time.sleep(0.1)
            came = [at for at in tap.changes if at >= begun]
            took += [came[0] - begun] if came else []
            missed += not came
        session.send_signal(signal.SIGINT)
        told = json.loads(session.communicate(timeout=60)[0])
    parts = np.percentile(took, [0, 50, 90, 99, 100]) * 1e3
    board = "C" if portable else "Python"
    print(f"{way}, board in {board}, load {os.getloadavg()[0]:.1f}: {len(took)} jumps, {missed} missed; ms from hand to wire")
    print("   least {:.2f}, middle {:.2f}, p90 {:.2f}, p99 {:.2f}, most {:.2f}".format(*parts), end="")
    print(f"; a tick and 2 ms are {(TICK_S + ROOM_S) * 1e3:.0f}: {parts[3] / (TICK_S + ROOM_S) / 1e3:.2f} times that")
    late, outputs = told["lateness_ms"], told["outputs"]
    print(
        f"   the session: {told['ticks']} ticks, late by p50 {late['p50']:.2f}, p99 {late['p99']:.2f}, most {late['max']:.2f}",
        end="",
    )
    print(f"; {told['late_ticks']} ticks late, {told['past_due']} past due; {told['priority']}\n   {outputs}", flush=True)


if __name__ == "__main__":
    main()
