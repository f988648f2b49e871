"""Expansion: cost a move from a thousand to a million moves, over the thousand's in the same run, and the highest memory.

What every expansion costs, however small, is about a millisecond; so the ratios are below 1 as long as nothing grows.

    python tests/bench/expansion.py
"""

import resource
import sys
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1]))

from conftest import make_rig

from composer.limits.abilities import abilities_of
from composer.rig.select import Selector
from composer.score.expand import expand
from composer.score.reading import read_score

SCORE = """\
tempo 96
tempo 96 to 72 from 9:1 to 13:1
phrase surge 8
  0    rest
  2    0.6    swell
  3    0.5    linear
  5    0.9    smooth over 1
  6    0.3    sudden
  8    rest   settle
phrase breath 4
  1    0.05
  2    rest
section all at 1:1
  r.*  surge  times {times} every 7.5 canon 1/64
"""
LAYER = "  r.*  breath after 1  times {times} every 7.5 add\n"

SIZES = ((1_000, 16), (10_000, 64), (100_000, 512), (1_000_000, 4096))


def main() -> None:
    """Print the table."""
    import numpy as np

    print(f"{'moves':>9} {'fibers':>7} {'layers':>7} {'us a move':>10} {'over first':>11}")
    base = {}
    for layered in (False, True):
        for moves, fibers in SIZES[:2] if "--small" in sys.argv else SIZES:
            rig = make_rig.__wrapped__()(fibers)
            abilities = abilities_of(rig)
            times = max(1, round(moves / (5 + 2 * layered) / fibers))
            text = SCORE + (LAYER if layered else "")
            score = read_score(text.format(times=times), "bench.score")
            selector = Selector(rig, {})
            least = np.inf
            for _ in range(3 if moves > 50_000 else 20):
                begun = time.perf_counter()
                tracks = expand(score, rig, abilities, selector)
                least = min(least, time.perf_counter() - begun)
            each = least / tracks.moves * 1e6
            base.setdefault(layered, []).append(each)
            over = each / base[layered][0]
            print(f"{tracks.moves:>9} {fibers:>7} {'yes' if layered else 'no':>7} {each:>10.3f} {over:>11.2f}")
    print(f"highest memory: {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f} MiB")


if __name__ == "__main__":
    main()
