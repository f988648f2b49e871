"""How long the program takes to say what it can do, over a Python that imports argparse and nothing else.

python tests/bench/starting.py [--small]
"""

import subprocess
import sys
import time
from pathlib import Path


def least(call: list[str], times: int) -> float:
    """The shortest of several runs, in s."""
    best = float("inf")
    for _ in range(times):
        begun = time.perf_counter()
        subprocess.run(call, check=True, stdout=subprocess.DEVNULL)
        best = min(best, time.perf_counter() - begun)
    return best


def main() -> None:
    """Print the ratio."""
    times = 3 if "--small" in sys.argv else 25
    script = Path(sys.executable).with_name("drawcord")
    call = [str(script)] if script.exists() else [sys.executable, "-m", "player.commands.main"]
    ours = least([*call, "--help"], times)
    theirs = least([sys.executable, "-c", "import argparse"], times)
    print(f"drawcord --help / import argparse = {ours / theirs:.2f} (3 at most)")


if __name__ == "__main__":
    main()
