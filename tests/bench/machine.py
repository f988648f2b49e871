"""What the machine itself does to who waits, for benches to print beside their own figures: cyclictest's where it is installed.

python tests/bench/machine.py [--seconds 60]
"""

import argparse
import os
import re
import shutil
import subprocess
import sys
from collections.abc import Sequence
from contextlib import suppress

SHARES = (0.5, 0.99, 0.999, 1.0)
HIGHEST_US = 100_000
EVERY_US = 2000

WAITS = """
import os, sys, time
every, lasts = float(sys.argv[1]), float(sys.argv[2])
try:
    os.sched_setscheduler(0, os.SCHED_FIFO, os.sched_param(80))
except (OSError, AttributeError):
    pass
due = time.monotonic()
end = due + lasts
while due < end:
    due += every
    time.sleep(max(0.0, due - time.monotonic()))
    print(round((time.monotonic() - due) * 1e6))
"""

BUSY = """
import numpy as np
picture = np.random.default_rng(1).random((1080, 1920, 3))
while True:
    np.sin(picture, out=picture)
"""


class Beside:
    """A waiter of the highest priority that is permitted, at work for so many seconds from now; `figures` once it is done."""

    def __init__(self, seconds: float):
        self.name = "cyclictest" if shutil.which("cyclictest") else "a bare loop"
        if self.name == "cyclictest":
            call = ["cyclictest", "-q", "-p80", "-m", f"-i{EVERY_US}", f"-D{max(1, round(seconds))}", f"-h{HIGHEST_US}"]
        else:
            call = [sys.executable, "-c", WAITS, str(EVERY_US * 1e-6), str(seconds)]
        self._process = subprocess.Popen(call, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, text=True)

    def figures(self) -> str:
        """How late it woke, as shares of its waits."""
        out, _ = self._process.communicate()
        late: list[int] = []
        if self.name == "cyclictest":
            for line in out.splitlines():
                if found := re.fullmatch(r"(\d+)\s+(\d+)\s*", line):
                    late += [int(found[1])] * int(found[2])
            if found := re.search(r"# Max Latencies: (\d+)", out):
                late.append(int(found[1]))
        else:
            late = [int(line) for line in out.split()]
        return f"{self.name} in the same time: {spread(late)} us late" if late else f"{self.name} told nothing"


def spread(values: Sequence[float], digits: int = 0) -> str:
    """Values at SHARES of them all, in one line."""
    ordered = sorted(values)
    parts = [f"{100 * share:g} %: {ordered[min(len(ordered) - 1, int(share * len(ordered)))]:.{digits}f}" for share in SHARES]
    return ", ".join(parts)


def busy() -> subprocess.Popen:
    """A process that computes pictures without rest, as a window does that is drawn as fast as it goes."""
    return subprocess.Popen([sys.executable, "-c", BUSY])


def first() -> bool:
    """Real-time priority for this process, where it is permitted."""
    with suppress(OSError, AttributeError):
        os.sched_setscheduler(0, os.SCHED_FIFO, os.sched_param(20))
        return True
    return False


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--seconds", type=float, default=60.0)
    print(Beside(parser.parse_args().seconds).figures())


if __name__ == "__main__":
    main()
