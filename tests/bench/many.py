"""Many fibers: 512 at 250 Hz over 8 lines to boards in C; 4096 to the simulated rig at 100 Hz, as shares of a core.

python tests/bench/many.py [--seconds 60] [--short] [--profile]
"""

import argparse
import cProfile
import csv
import pstats
import sys
import tempfile
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1]))

import numpy as np
from conftest import make_rig
from machine import Beside, first, spread

from composer.limits.abilities import abilities_of
from composer.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, Tracks
from player.engine.clock import SteadyClock, VirtualClock
from player.engine.loop import Engine
from player.engine.quiet import no_collecting
from player.engine.source import Driven
from player.outputs.board import Board
from player.outputs.portable_board import PortableBoard, compiled
from player.outputs.sim import Sim
from player.wire.device_c.plant import plant_text
from player.wire.rules import Build
from player.wire.simulated import Bench

UP_S, TURN_S, STROKE = 2.0, 5.0, 0.2


def swaying(fibers: int, seconds: float) -> Tracks:
    """Every fiber up and down all the time, each a little after the one before."""
    turns = max(1, int(seconds / TURN_S))
    rise, fall = STROKE * PROGRESS["smooth"], -STROKE * PROGRESS["smooth"]
    fall = fall + np.array([STROKE, 0, 0, 0, 0, 0])
    still, up = np.zeros(6), np.array([STROKE, 0, 0, 0, 0, 0])
    curve = np.tile([still, *[rise, up, fall, still] * turns], (fibers, 1))
    manner = np.array([HOLD, *[MOVE, HOLD, MOVE, HOLD] * turns], dtype=np.int8)
    begins = np.array([0.1, 0.1 + UP_S, 0.1 + UP_S, 0.1 + 2 * UP_S])
    begins[1:3] = 0.1 + UP_S, 0.15 + UP_S
    begins[3] = begins[2] + UP_S
    times = np.concatenate([[0.0], *(begins + TURN_S * turn for turn in range(turns))])
    late = np.linspace(0.0, 0.7, fibers)[:, None] * (times > 0.0)
    knots = len(times)
    nothing = np.zeros(fibers * knots, dtype=np.int32)
    return Tracks(
        first=np.arange(fibers + 1) * knots,
        time_s=(times + late).ravel(),
        curve=curve,
        manner=np.tile(manner, fibers),
        shape=np.full(fibers * knots, NAMES.index("smooth"), dtype=np.int8),
        line=nothing,
        phrase_line=nothing,
        duration_s=turns * TURN_S,
    )


def to_boards(seconds: float) -> None:
    """512 fibers over 8 lines."""
    rig = make_rig.__wrapped__()(512, boards=8, drive="pressure", air_mL=0.1)
    abilities, clock = abilities_of(rig), SteadyClock()
    with tempfile.TemporaryDirectory() as name:
        boards = []
        for driver in rig.drivers:
            build = Build(
                driver.name,
                Bench(rig, abilities, driver.name).drives,
                senses_strain=True,
                senses_supply=True,
                rig=rig.fingerprint,
            )
            text = plant_text(rig, abilities, driver.name, build)
            boards.append(PortableBoard(compiled(64), text, f"{name}/{driver.name}.csv", ()))
        outputs = [
            Board(rig, abilities, driver.name, board.path, 2_000_000, clock)
            for driver, board in zip(rig.drivers, boards, strict=True)
        ]
        engine = Engine(rig, Driven(rig, abilities, swaying(512, seconds)), outputs, clock, 250.0, abilities=abilities)
        urgent = first()
        try:
            for output in outputs:
                output.open()
            wrong = [mark for mark in engine.preflight() if not mark.ok]
            assert not wrong, wrong
            beside = Beside(seconds)
            engine.arm()
            began, used = time.monotonic(), time.process_time()
            for _ in engine.run():
                pass
            share = (time.process_time() - used) / (time.monotonic() - began)
        finally:
            engine.close()
            for board in boards:
                board.stop()
                board.run()
        late_us, starts = [], []
        for driver in rig.drivers:
            with open(f"{name}/{driver.name}.csv", newline="") as file:
                rows = [row for row in csv.DictReader(file) if row["event"] == "set"]
            late_us += [int(row["late_us"]) for row in rows]
            starts.append([float(row["host_s"]) for row in rows])
    count = min(map(len, starts))
    apart_us = 1e6 * np.ptp(np.array([one[:count] for one in starts]), axis=0)
    lateness = engine.lateness
    print(f"512 fibers at 250 Hz over 8 lines: {lateness.ticks} ticks, {100 * share:.0f} % of a core, {engine.ending.why}")
    late = ", ".join(f"{100 * of:g} %: {1e3 * lateness.quantile_s(of):.3f}" for of in (0.5, 0.99, 0.999))
    print(f"   in the player: {late} ms late, worst {1e3 * lateness.worst_s:.3f}; real-time priority: {urgent}")
    print(f"   at the valves: {spread(late_us)} us late; boards apart by {spread(apart_us.tolist())} us")
    print(f"   {beside.figures()}", flush=True)


def to_sim(fibers: int, rate: float, seconds: float) -> None:
    """Many fibers to the simulated rig: computing a second of it, in seconds, is the share of a core that it takes."""
    rig = make_rig.__wrapped__()(fibers, boards=-(-fibers // 512), air_mL=0.01)
    abilities = abilities_of(rig)
    clock = VirtualClock()
    sim = Sim(rig, abilities, tuple(driver.name for driver in rig.drivers))
    engine = Engine(rig, Driven(rig, abilities, swaying(fibers, seconds)), [sim], clock, rate, abilities=abilities)
    engine.preflight()
    engine.arm()
    took, began = [], time.process_time()
    with no_collecting():
        for _ in engine.run():
            now = time.process_time()
            took.append(1e3 * (now - began))
            began = now
    share = sum(took) / len(took) * rate / 10.0
    print(f"{fibers} fibers to sim at {rate:g} Hz: {share:.1f} % of a core; a tick takes {spread(took, 2)} ms", flush=True)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--short", action="store_true", help="10 s each")
    parser.add_argument("--profile", action="store_true", help="where the time of 4096 fibers to sim goes")
    asked = parser.parse_args()
    seconds = 10.0 if asked.short else asked.seconds
    if asked.profile:
        profile = cProfile.Profile()
        profile.runcall(to_sim, 4096, 100.0, seconds)
        pstats.Stats(profile).sort_stats("tottime").print_stats(30)
        return
    to_sim(48, 100.0, seconds)
    to_sim(4096, 100.0, seconds)
    to_boards(seconds)


if __name__ == "__main__":
    main()
