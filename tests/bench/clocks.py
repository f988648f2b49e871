"""How well the clock of a board is known after a minute, with 1 ms of jitter each way and 200 ppm of drift; in virtual time.

python tests/bench/clocks.py [--seconds 60] [--lines 200] [--jitter-ms 1] [--ppm 200] [--short]
"""

import argparse
from random import Random

from machine import spread

from player.wire.clock import TURN, Clock

PING_S, LEAST_S = 0.0625, 0.0002
"""How often the host asks, and how long a message takes at least."""


def error_us(seconds: float, jitter_s: float, ppm: float, chance: Random) -> tuple[float, float]:
    """By how much the estimate is off after so many seconds, and the bound that it gives for that."""
    clock, rate, start = Clock(), 1e6 * (1.0 + ppm * 1e-6), chance.random() * TURN
    at = 0.0
    while at < seconds:
        there = at + LEAST_S + chance.random() * jitter_s
        back = there + LEAST_S + chance.random() * jitter_s
        clock.heard(at, back, int(start + there * rate) % TURN)
        at = max(at + PING_S, back)
    truth = (start + seconds * rate) % TURN
    off = (clock.device_us(seconds) - truth + TURN / 2) % TURN - TURN / 2
    return abs(off), clock.bound_us(seconds)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--lines", type=int, default=200)
    parser.add_argument("--jitter-ms", type=float, default=1.0)
    parser.add_argument("--ppm", type=float, default=200.0)
    parser.add_argument("--short", action="store_true", help="20 lines")
    asked = parser.parse_args()
    chance = Random(5)
    found = [
        error_us(asked.seconds, 1e-3 * asked.jitter_ms, sign * asked.ppm, chance)
        for sign in (1.0, -1.0)
        for _ in range((20 if asked.short else asked.lines) // 2)
    ]
    print(f"{len(found)} lines, {asked.jitter_ms:g} ms of jitter each way, {asked.ppm:g} ppm either way, {asked.seconds:g} s:")
    print(f"   off by {spread([off for off, _ in found], 1)} us")
    outside = sum(off > bound for off, bound in found)
    print(f"   bound  {spread([bound for _, bound in found], 1)} us; truth outside of it: {outside}")


if __name__ == "__main__":
    main()
