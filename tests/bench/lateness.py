"""How late ticks come in the player, and sets at the valves of a board in C, while a window computes beside; with the machine's
own figures of the same minutes. Then once more with the player stopped for 50 ms every second, which no valve may notice.

    python tests/bench/lateness.py [--seconds 600] [--rate 500] [--short]
"""

import argparse
import csv
import json
import os
import signal
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from machine import Beside, busy, spread

from composer.limits.abilities import abilities_of
from composer.load import load_rig
from player.outputs.portable_board import PortableBoard, compiled
from player.wire.device_c.plant import plant_text
from player.wire.rules import Build
from player.wire.simulated import Bench

DEMO = Path(__file__).parents[2] / "scores_demo" / "estuary.rig.toml"
SCORE = """title "Bench"
rig {rig}
tempo 60
phrase sway 8
  0 rest
  3 0.5
  4 0.5
  7 rest
section only at 1:1
  * sway times {times}
"""
STOPPED_S, EVERY_S = 0.05, 1.0
MAIN = [sys.executable, "-m", "player.commands.main"]


def board(folder: Path) -> PortableBoard:
    """The board of Estuary in C, with a log."""
    rig = load_rig(str(DEMO))
    abilities = abilities_of(rig)
    drives = Bench(rig, abilities, rig.drivers[0].name).drives
    build = Build("bench", drives, senses_strain=True, senses_supply=True, rig=rig.fingerprint)
    text = plant_text(rig, abilities, rig.drivers[0].name, build)
    return PortableBoard(compiled(len(drives)), text, str(folder / "board.csv"), ())


def holders(port: str, but: int) -> set[int]:
    """Processes that hold a port, but for the board's own and this one."""
    found = set()
    for pid in filter(str.isdigit, os.listdir("/proc")):
        try:
            if any(os.readlink(f"/proc/{pid}/fd/{one}") == port for one in os.listdir(f"/proc/{pid}/fd")):
                found.add(int(pid))
        except OSError:
            continue
    return found - {but, os.getpid()}


def stop_and_go(playing: subprocess.Popen, players: set[int], seconds: float) -> int:
    """Stop the player's processes now and then for that long; returns how often."""
    times, end = 0, time.monotonic() + seconds
    while playing.poll() is None and time.monotonic() < end:
        time.sleep(EVERY_S - STOPPED_S)
        for number, pause_s in ((signal.SIGSTOP, STOPPED_S), (signal.SIGCONT, 0.0)):
            for pid in players:
                os.kill(pid, number)
            time.sleep(pause_s)
        times += 1
    return times


def run(seconds: float, rate: float, stops: bool) -> None:
    """One run, and its figures."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        (folder / "bench.score").write_text(SCORE.format(rig=DEMO, times=max(1, round(seconds / 8.0))))
        device = board(folder)
        window = busy()
        beside = Beside(seconds)
        call = [*MAIN, "play", "bench.score", "--retime", "--to", f"serial:{device.path}@2000000", "--rate", f"{rate:g}"]
        playing = subprocess.Popen(
            [*call, "--arm", "--json", "--log", "run.log"], cwd=folder, stdout=subprocess.PIPE, text=True
        )
        times = 0
        try:
            if stops:
                log = folder / "run.log"
                while playing.poll() is None and (not log.exists() or log.stat().st_size < 200_000):
                    time.sleep(0.05)
                # Long enough ahead of the end that nothing of the coming to rest is stopped.
                players = {playing.pid} | holders(device.path, device._process.pid)
                times = stop_and_go(playing, players, seconds - 4.0)
            out, _ = playing.communicate()
        finally:
            window.kill()
            window.wait()
        device.stop()
        device.run()
        told = json.loads(out)
        with (folder / "board.csv").open(newline="") as file:
            rows = [row for row in csv.DictReader(file) if row["event"] == "set"]
    late_us = [int(row["late_us"]) for row in rows]
    late = told["lateness_ms"]
    print(
        f"{told['ticks']} ticks at {rate:g} Hz"
        + (f", the player stopped {times} times for {STOPPED_S * 1e3:.0f} ms" if stops else "")
    )
    print(f"   in the player: 50 %: {late['p50']}, 99 %: {late['p99']}, 99.9 %: {late['p99.9']}, 100 %: {late['max']} ms late")
    print(f"   at the valves: {spread(late_us)} us late; {sum(row['note'] == 'late' for row in rows)} sets came too late")
    print(f"   {beside.figures()}")
    print(f"   {told['ended']}, stalls {told['stalls']}, priority {told['priority']}, faults {len(told['faults'])}", flush=True)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--seconds", type=float, default=600.0)
    parser.add_argument("--rate", type=float, default=500.0)
    parser.add_argument("--short", action="store_true", help="20 s each")
    asked = parser.parse_args()
    seconds = 20.0 if asked.short else asked.seconds
    run(seconds, asked.rate, stops=False)
    run(min(seconds, 60.0), asked.rate, stops=True)


if __name__ == "__main__":
    main()
