"""Memory of a run that goes on and on, in virtual time to the simulated rig and in real time to a board in C; log over wire.

python tests/bench/soak.py [--virtual-minutes 60] [--minutes 10] [--short]
"""

import argparse
import sys
import tempfile
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1]))

from conftest import make_rig
from machine import first
from many import swaying

from composer.limits.abilities import abilities_of
from player.engine.clock import SteadyClock, VirtualClock
from player.engine.loop import Engine
from player.engine.run_log import RunLog
from player.engine.source import Driven
from player.outputs.board import Board
from player.outputs.portable_board import PortableBoard, compiled
from player.outputs.serial_line import SerialLine
from player.outputs.sim import Sim
from player.wire.device_c.plant import plant_text
from player.wire.rules import Build
from player.wire.simulated import Bench

LOOKS = 13
FIBERS, RATE_HZ = 48, 200.0
PAGE_KIB = 4


def resident_KiB() -> int:
    """Memory of this process that is in the machine's."""
    return int(Path("/proc/self/statm").read_text().split()[1]) * PAGE_KIB


class Counted(SerialLine):
    """A line that counts what it carries."""

    carried = 0

    def read(self) -> bytes:
        data = super().read()
        Counted.carried += len(data)
        return data

    def write(self, data: bytes, *, first: bool = False) -> int:
        Counted.carried += len(data)
        return super().write(data, first=first)


def soak(engine: Engine, log: Path, seconds: float) -> None:
    """Run it, and look at memory at LOOKS moments of the same distance."""
    with open(log, "wb", buffering=0) as file:
        engine.keep_log(RunLog(file.write))
        engine.arm()
        looks, began = [], time.process_time()
        for status in engine.run():
            if status.position_s >= len(looks) * seconds / (LOOKS - 1):
                looks.append(resident_KiB())
    grown = 100.0 * (looks[-1] - looks[min(1, len(looks) - 1)]) / looks[0]
    print(f"   {engine.lateness.ticks} ticks, {engine.ending.why}; {time.process_time() - began:.0f} s of a core")
    print(f"   KiB in memory, one after another: {looks}; from the second to the last {grown:+.2f} %", flush=True)


def virtual(seconds: float) -> None:
    rig = make_rig.__wrapped__()(FIBERS, drive="pressure", air_mL=0.1)
    abilities = abilities_of(rig)
    engine = Engine(
        rig, Driven(rig, abilities, swaying(FIBERS, seconds)), [Sim(rig, abilities, ("main",))], VirtualClock(), RATE_HZ
    )
    engine.preflight()
    print(f"{seconds / 60:g} minutes in virtual time, {FIBERS} fibers at {RATE_HZ:g} Hz to sim")
    with tempfile.TemporaryDirectory() as folder:
        soak(engine, Path(folder) / "run.log", seconds)
    engine.close()


def real(seconds: float) -> None:
    first()
    rig = make_rig.__wrapped__()(FIBERS, drive="pressure", air_mL=0.1)
    abilities, clock = abilities_of(rig), SteadyClock()
    build = Build("bench", Bench(rig, abilities, "main").drives, senses_strain=True, senses_supply=True, rig=rig.fingerprint)
    device = PortableBoard(compiled(FIBERS), plant_text(rig, abilities, "main", build), None, ())
    output = Board(rig, abilities, "main", device.path, 2_000_000, clock)
    output._line = Counted(device.path, 2_000_000)
    engine = Engine(rig, Driven(rig, abilities, swaying(FIBERS, seconds)), [output], clock, RATE_HZ)
    try:
        output.open()
        wrong = [mark for mark in engine.preflight() if not mark.ok]
        assert not wrong, wrong
        print(f"{seconds / 60:g} minutes in real time to a board in C")
        Counted.carried = 0
        with tempfile.TemporaryDirectory() as folder:
            log = Path(folder) / "run.log"
            soak(engine, log, seconds)
            size = log.stat().st_size
        print(f"   log {size} bytes, wire {Counted.carried}: {size / Counted.carried:.2f} times as much")
    finally:
        engine.close()
        device.stop()
        device.run()


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--virtual-minutes", type=float, default=60.0)
    parser.add_argument("--minutes", type=float, default=10.0)
    parser.add_argument("--short", action="store_true", help="two minutes of virtual time, 20 s of real")
    asked = parser.parse_args()
    virtual(120.0 if asked.short else 60.0 * asked.virtual_minutes)
    real(20.0 if asked.short else 60.0 * asked.minutes)


if __name__ == "__main__":
    main()
