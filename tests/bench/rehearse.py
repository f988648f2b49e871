"""The rehearse window with 512 fibers that all move: VENT from the key to the wire, frames a second, what it costs the engine.

VENT: the key is put into the window's queue at chance moments while it redraws; beside it, a process of its own reads the line
to one of eight boards and notes when the vent frame passes. Frames: how often the hang view is drawn. Engine: how late ticks
come with the window and without, in turns, as the ratio of p99.9.

    python tests/bench/rehearse.py [vent|frames|engine] [--vents 100] [--seconds 20] [--pairs 3] [--small]

Without a screen, QT_QPA_PLATFORM=offscreen draws all the same.
"""

import argparse
import multiprocessing
import os
import pty
import random
import select
import statistics
import subprocess
import sys
import tempfile
import threading
import time
import tty
from contextlib import ExitStack
from pathlib import Path

import numpy as np
from PySide6.QtCore import QCoreApplication, QEvent, Qt
from PySide6.QtGui import QKeyEvent

sys.path.insert(0, str(Path(__file__).parents[1]))

from conftest import small_rig

from player.commands import rehearse_ways
from player.window.start import application
from player.window.window import RehearseWindow
from player.wire.frames import FrameReader
from player.wire.messages import Vent, decode

BOARDS, EACH = 8, 64
MAIN = [sys.executable, "-m", "player.commands.main"]
SCORE = """title "Bench"
rig bench.rig.toml
tempo 60
phrase sway 4
  0 rest
  2 0.6
  4 rest
section all at 1:1
  * sway times 400
"""


def tap(board: str, names, noted) -> None:
    """A serial line between player and board that notes when a vent frame passes; a process of its own."""
    far = os.open(board, os.O_RDWR | os.O_NOCTTY)
    near, slave = pty.openpty()
    tty.setraw(far)
    tty.setraw(slave)
    names.send(os.ttyname(slave))
    frames = FrameReader()
    while True:
        ready, _, _ = select.select([far, near], [], [])
        now = time.monotonic()
        for one, other in ((near, far), (far, near)):
            if one in ready:
                data = os.read(one, 65536)
                os.write(other, data)
                if one == near:
                    for payload in frames.feed(data):
                        message = decode(payload)
                        message = message[0] if isinstance(message, tuple) else message
                        if isinstance(message, Vent):
                            noted.send(now)


def wait(true, seconds: float = 60.0, window: RehearseWindow | None = None) -> None:
    """The application alive, until something is so; where it never is, the window's log says what is."""
    end = time.monotonic() + seconds
    while not true():
        if time.monotonic() > end:
            said = "\n".join(window.told.lines[-8:]) if window is not None else ""
            raise SystemExit(f"the bench waits for something that does not come\n{said}")
        QCoreApplication.processEvents()
        time.sleep(0.0005)


def window_at(targets: tuple[str, ...], **how) -> RehearseWindow:
    """A window that has begun a run, armed it and plays it."""
    usual = dict.fromkeys(("map_path", "osc", "take", "start", "rate", "log", "rig")) | {"midi": (), "mend": False}
    window = RehearseWindow(rehearse_ways.beginning(score="bench.score", targets=targets, rule="rest", **(usual | how)))
    window.resize(1280, 800)
    window.show()
    wait(lambda: window.told.marks is not None and window._drawn, 60.0, window)
    if not window.told.marks["ok"]:
        raise SystemExit("\n".join(f"{one['asked']}: {one['found']}" for one in window.told.marks["marks"] if not one["ok"]))
    window.link.say("arm")
    window.link.say("play", from_s=0.0)
    wait(lambda: window.now.state == "playing" and window.now.array("wanted").max() > 0.01, 60.0, window)
    return window


def ended(window: RehearseWindow) -> dict:
    """The report of a window's run, brought to rest now."""
    window.link.say("stop")
    wait(lambda: window.stage == "over")
    report = window.told.last[1].get("report", {})
    window.close()
    return report


def vent(vents: int, stack: ExitStack) -> None:
    """Key to wire."""
    from multiprocessing import Pipe

    targets, noted = [], None
    for number in range(BOARDS):
        call = [*MAIN, "device", "bench.rig.toml", "--driver", f"b{number + 1}", "--portable"]
        device = subprocess.Popen(call, stdout=subprocess.PIPE, text=True)
        stack.callback(device.wait)
        stack.callback(device.terminate)
        path = device.stdout.readline().strip()
        if number == BOARDS - 1:
            (names, named), (noted, notes) = Pipe(False), Pipe(False)
            reader = multiprocessing.get_context("fork").Process(target=tap, args=(path, named, notes), daemon=True)
            reader.start()
            stack.callback(reader.terminate)
            path = names.recv()
        targets.append(f"b{number + 1}=serial:{path}")
    window = window_at(tuple(targets), osc="9437")
    took, chance, drawn = [], random.Random(8), window.parts.hang.shown
    pressed: list[float] = []
    said: list[float] = []
    say = window.link.client.say

    def told(name: str, **fields) -> bool:
        if name == "vent":
            said.append(time.monotonic() - pressed[0])
        return say(name, **fields)

    window.link.client.say = told

    def press(after_s: float) -> None:
        time.sleep(after_s)
        pressed.append(time.monotonic())
        QCoreApplication.postEvent(window, downs[0])

    while len(took) < vents:
        pressed.clear()
        downs = [QKeyEvent(QEvent.Type.KeyPress, Qt.Key.Key_Escape, Qt.KeyboardModifier.NoModifier)]
        threading.Thread(target=press, args=(0.3 + chance.uniform(0.0, 0.1),)).start()
        wait(lambda: noted.poll(0), 60.0, window)
        took.append(noted.recv() - pressed[0])
        wait(lambda: window.now.state == "vented", 60.0, window)
        window.link.say("bring_back")
        wait(lambda: window.now.state == "playing" and window.now.text("phase") == "playing", 60.0, window)
        while noted.poll(0):
            noted.recv()
    parts = np.percentile(took, [0, 50, 90, 99, 100]) * 1e3
    print(f"VENT, {len(took)} times, ms from the key to the frame on the wire: least, middle, p90, p99, most")
    print("   " + ", ".join(f"{one:.2f}" for one in parts) + f"; p99 is {parts[3] / 20.0:.2f} times 20 ms", end="")
    print(f"; the picture last cost {drawn.cost_ms:.1f} ms")
    print("   of that in the window: middle {:.2f}, p99 {:.2f}".format(*(np.percentile(said, [50, 99]) * 1e3)))
    ended(window)


def frames(seconds: float) -> None:
    """How often the fibers are drawn."""
    window = window_at(("file:bench.rec",))
    view = window.parts.hang.shown
    at: list[float] = []
    seen, end = view.frames, time.monotonic() + seconds

    def over() -> bool:
        nonlocal seen
        if view.frames != seen:
            seen = view.frames
            at.append(time.monotonic())
        return time.monotonic() > end

    wait(over, seconds + 60.0)
    gaps, rate = np.diff(at) * 1e3, len(at) / seconds
    print(f"frames of {BOARDS * EACH} fibers: {rate:.1f} a second, {rate / 30.0:.2f} times 30; gaps: middle ", end="")
    print(f"{np.median(gaps):.1f}, p99 {np.percentile(gaps, 99):.1f} ms; one costs {view.cost_ms:.1f} ms to draw")
    ended(window)


def engine(seconds: float, pairs: int) -> None:
    """Lateness with the window and without, in turns."""
    late: dict[str, list[float]] = {"with": [], "without": []}
    for _ in range(pairs):
        for how in ("with", "without"):
            window = window_at(("file:bench.rec",))
            if how == "without":
                window._frames.stop()
                window.hide()
            end = time.monotonic() + seconds
            wait_quietly = (lambda: time.sleep(0.05)) if how == "without" else (lambda: QCoreApplication.processEvents())
            while time.monotonic() < end:
                wait_quietly()
                time.sleep(0.0005)
            if how == "without":
                window._frames.start(0)
            late[how].append(ended(window)["lateness_ms"]["p99.9"])
            Path("bench.rec").unlink(missing_ok=True)
    ratios = [one / max(other, 1e-3) for one, other in zip(late["with"], late["without"], strict=True)]
    print(f"the engine's ticks late, p99.9 in ms, in turns: with {late['with']}, without {late['without']}")
    print(f"   ratio, middle of {pairs}: {statistics.median(ratios):.2f}")


def main() -> None:
    """All three, or one."""
    parser = argparse.ArgumentParser()
    parser.add_argument("what", nargs="?", choices=("vent", "frames", "engine"))
    parser.add_argument("--vents", type=int, default=100)
    parser.add_argument("--seconds", type=float, default=20.0)
    parser.add_argument("--pairs", type=int, default=3)
    parser.add_argument("--short", "--small", action="store_true")
    given = parser.parse_args()
    vents, seconds, pairs = (10, 4.0, 1) if given.short else (given.vents, given.seconds, given.pairs)
    with ExitStack() as stack:
        folder = stack.enter_context(tempfile.TemporaryDirectory())
        os.environ["XDG_RUNTIME_DIR"] = stack.enter_context(tempfile.TemporaryDirectory(prefix="runs-"))
        os.chdir(folder)
        stack.callback(os.chdir, "/")
        rows = tuple((f"r{n + 1}", f"b{n + 1}") for n in range(BOARDS))
        # Held by lean valves and a large supply: what is to be seen is the window, not a governor at its limits.
        rig = small_rig.__wrapped__()(
            rows=rows, count=EACH, channels=EACH, rest_length_mm=800, fill_rate_per_s=2.0, exhaust_rate_per_s=2.0,
            C_dm3_s_bar=0.02, receiver_L=2000, compressor_L_min=5000,
        )  # fmt: skip
        Path("bench.rig.toml").write_text(rig)
        Path("bench.score").write_text(SCORE)
        application()
        if given.what in (None, "vent"):
            vent(vents, stack)
        if given.what in (None, "frames"):
            frames(seconds)
        if given.what in (None, "engine"):
            engine(seconds, pairs)


if __name__ == "__main__":
    main()
