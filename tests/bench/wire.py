"""How late sets are at the valves of a simulated board on a pseudo-terminal, and what the wire costs, printed from one run.

python tests/bench/wire.py [--seconds 60] [--rate 500] [--channels 48] [--ahead 0.05] [--portable]
"""

import argparse
import csv
import os
import select
import subprocess
import sys
import tempfile
import time
from contextlib import suppress
from pathlib import Path

from composer.load import load_rig
from player.engine.clock import SteadyClock
from player.outputs.serial_line import SerialLine
from player.wire import messages as m
from player.wire.frames import FrameReader, frame
from player.wire.host import Host

DEMO = Path(__file__).parents[2] / "scores_demo" / "estuary.rig.toml"


def cost_us(deed, turns: int = 5000) -> float:
    """Mean time of a deed in µs."""
    begin = time.perf_counter()
    for _ in range(turns):
        deed()
    return (time.perf_counter() - begin) / turns * 1e6


def costs(channels: int) -> None:
    """Encoding and decoding of one set, against copying its bytes, which nothing can do without."""
    values = tuple((n * 7919) % 65536 for n in range(channels))
    sent = frame(m.encode(m.Set(5, 0, values), 1))
    reader = FrameReader()
    write = cost_us(lambda: frame(m.encode(m.Set(5, 0, values), 1)))
    read = cost_us(lambda: m.decode(reader.feed(sent)[0]))
    copy = cost_us(lambda: bytearray(sent))
    print(
        f"a set of {channels}: written in {write:.1f} us, read in {read:.1f} us, {write / copy:.0f}, {read / copy:.0f} copies"
    )


def bare_us(rate: float, seconds: float) -> list[int]:
    """How late a loop is that does nothing but wait, sorted: what the machine itself costs."""
    with suppress(OSError):
        os.sched_setscheduler(0, os.SCHED_FIFO, os.sched_param(10))
    late, due = [], time.monotonic()
    for _ in range(int(rate * seconds)):
        due += 1.0 / rate
        SteadyClock(0.0003).wait_until(due)
        late.append(round((time.monotonic() - due) * 1e6))
    return sorted(late)


def play(path: str, rig: int, channels: int, rate: float, seconds: float, ahead: float) -> Host:
    """Greet, arm, send sets ahead of their time, rest."""
    line = SerialLine(path, 2_000_000)
    line.open()
    host = Host(channels, rig)
    host.open(time.monotonic())
    begin, sent, total = None, 0, int(rate * seconds)
    listen = time.monotonic() + 1.0
    while True:
        now = time.monotonic()
        host.receive(line.read(), now)
        host.tick(now)
        if host.state == "ready" and begin is None and now > listen:
            host.arm(now)
        elif host.state == "armed":
            begin = begin or now + ahead
            while sent < total and begin + sent / rate < now + ahead:
                host.set(begin + sent / rate, 0, [sent * 50 % 60000] * channels, now)
                sent += 1
            if sent >= total and now > begin + seconds:
                host.rest(0.2, now)
        elif host.state in ("failed", "vented") or (host.state == "ready" and begin is not None):
            break
        line.write(host.to_send())
        select.select([line], [], [], 0.001)
    line.close()
    return host


def main() -> None:
    """Run and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--rate", type=float, default=500.0)
    parser.add_argument("--channels", type=int, default=48)
    parser.add_argument("--ahead", type=float, default=0.05)
    parser.add_argument("--portable", action="store_true", help="the board in C")
    asked = parser.parse_args()
    costs(asked.channels)
    rig = load_rig(str(DEMO))
    with tempfile.TemporaryDirectory() as folder:
        log = Path(folder) / "log.csv"
        call = [sys.executable, "-c", "from player.commands.main import main; main()", "device", str(DEMO), "--log", str(log)]
        call += ["--portable"] * asked.portable
        device = subprocess.Popen(call, stdout=subprocess.PIPE, text=True)
        try:
            path = device.stdout.readline().strip()
            host = play(path, rig.fingerprint, asked.channels, asked.rate, asked.seconds, asked.ahead)
        finally:
            device.terminate()
            device.communicate(timeout=20)
        with log.open(newline="") as file:
            late_us = sorted(int(row["late_us"]) for row in csv.DictReader(file) if row["event"] == "set")
    print(
        f"{host.state}: {len(late_us)} sets at {asked.rate:g} Hz, {host.late} came after their due time, {host.skipped} skipped"
    )
    bare = bare_us(asked.rate, min(asked.seconds, 20.0))
    for share in (0.5, 0.99, 0.999, 1.0):
        at, least = (row[min(len(row) - 1, int(share * len(row)))] for row in (late_us, bare))
        print(f"   {100 * share:5.1f} % applied within {at} us of due; a bare loop on this machine: {least} us")
    print(f"   board's clock known to {host.clock.bound_us(time.monotonic()):.0f} us, bad frames {host.bad + host.unreadable}")


if __name__ == "__main__":
    main()
