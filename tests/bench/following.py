"""A clock that jitters, followed: the tempo after 4 counts, and where hits land after that; in virtual time, at many tempos.

A hit lands where the follower said that its count would be when the set that lands it left, so long before it as sets leave.

python tests/bench/following.py [--clocks 200] [--jitter-ms 1] [--counts 16] [--short]
"""

import argparse

import numpy as np
from machine import spread

from player.engine.loop import AHEAD_S
from player.inputs.events import Timing
from player.inputs.midi_clock import TICKS, ClockFollower

TEMPOS = (40.0, 72.0, 96.0, 120.0, 180.0, 300.0)
KNOWN_BY = 4
"""Counts after which the tempo is to be known."""


def followed(a_minute: float, jitter_s: float, counts: int, chance: np.random.Generator) -> tuple[float, list[float]]:
    """One clock: by how much its tempo is off after 4 counts, as a share, and by how many seconds hits are that land later.

    Every tick comes up to `jitter_s` early or late, each by chance alone.
    """
    follower, count_s = ClockFollower(), 60.0 / a_minute
    true_s = 10.0 + np.arange(counts * TICKS + 1) * count_s / TICKS
    heard_s = np.maximum.accumulate(true_s + chance.uniform(-jitter_s, jitter_s, len(true_s)))
    follower.hear(Timing("clock", 9.9, "start"))
    off, late, leaves = 0.0, [], {}
    for number in range(KNOWN_BY + 1, counts + 1):
        leaves[number] = true_s[number * TICKS] - AHEAD_S
    for number, at_s in enumerate(heard_s):
        for count in [count for count, moment in leaves.items() if moment <= at_s]:
            beat = follower.beat(leaves.pop(count))
            late.append(beat.when(float(count)) - true_s[count * TICKS])
        follower.hear(Timing("clock", float(at_s), "clock"))
        if number == KNOWN_BY * TICKS:
            off = abs(follower.beat(float(at_s)).rate * count_s - 1.0)
    return off, late


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--clocks", type=int, default=200, help="at each tempo")
    parser.add_argument("--jitter-ms", type=float, default=1.0)
    parser.add_argument("--counts", type=int, default=16)
    parser.add_argument("--short", action="store_true", help="10 clocks at each tempo")
    asked = parser.parse_args()
    chance = np.random.default_rng(6)
    offs, lates = [], []
    for a_minute in TEMPOS:
        for _ in range(10 if asked.short else asked.clocks):
            off, late = followed(a_minute, 1e-3 * asked.jitter_ms, asked.counts, chance)
            offs.append(100.0 * off)
            lates += [1e3 * abs(one) for one in late]
    print(f"{len(offs)} clocks, {TEMPOS[0]:g} to {TEMPOS[-1]:g} counts a minute, ticks up to {asked.jitter_ms:g} ms off:")
    print(f"   tempo after {KNOWN_BY} counts off by {spread(offs, 3)} percent")
    print(f"   {len(lates)} hits land off by {spread(lates, 2)} ms")


if __name__ == "__main__":
    main()
