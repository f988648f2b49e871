"""Checking: cost a move from a thousand to a million moves over the thousand's, and over rate tables over rated fibers.

No two moves are alike, so nothing is gained by working a repeated one out once; one in a hundred is too fast.

    python tests/bench/checking.py
"""

import dataclasses
import resource
import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from conftest import make_rig

from composer.limits.abilities import Abilities, abilities_of
from composer.limits.check import check
from composer.limits.duration import least_durations
from composer.rig.model import Rig
from composer.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, Tracks

SHAPES = ("smooth", "linear", "swell", "settle")
MAKES, POINTS = 16, 65
SIZES = ((1_000, 16), (10_000, 64), (100_000, 512), (1_000_000, 4096))


def rated(fibers: int) -> tuple[Rig, Abilities]:
    """A rig of rated fibers with every limit on."""
    rig = make_rig.__wrapped__()(fibers, accel=40.0, max_hold_s=60.0, duty=0.95)
    return rig, abilities_of(rig)


def modelled(abilities: Abilities, random: np.random.Generator) -> Abilities:
    """The same fibers in makes whose rates change with strain, as a fiber's do that is fed through a tube."""
    strain = np.tile(np.linspace(0.0, 0.3, POINTS), (MAKES, 1))
    slower = random.uniform(1.0, 4.0, (MAKES, 1))
    return dataclasses.replace(
        abilities,
        capabilities=abilities.capabilities * MAKES,
        which=np.arange(len(abilities.which)) % MAKES,
        strain=strain,
        fill=0.9 * np.exp(-slower * strain),
        exhaust=0.15 + slower * strain / 2.0,
        air_L=0.003 * (strain / 0.3) ** 1.3,
    )


def score(moves: int, abilities: list[Abilities], fibers: int, random: np.random.Generator) -> Tracks:
    """Random moves, each with a hold after it, that every one of the abilities can do but for one in a hundred."""
    each = moves // fibers
    level = random.uniform(0.0, 0.28, (fibers, each + 1))
    level[:, 0] = 0.0
    kind = random.integers(0, len(SHAPES), (fibers, each))
    curve = np.zeros((fibers, 2 * each + 1, 6))
    progress = np.array([PROGRESS[name] for name in SHAPES])
    curve[:, 0:-1:2] = np.diff(level, axis=1)[..., None] * progress[kind]
    curve[:, 0:-1:2, 0] += level[:, :-1]
    curve[:, 1:-1:2, 0], curve[:, -1, 0] = level[:, 1:], level[:, -1]
    manner = np.full((fibers, 2 * each + 1), HOLD, dtype=np.int8)
    manner[:, 0:-1:2] = MOVE
    shape = np.full(manner.shape, -1, dtype=np.int8)
    shape[:, 0:-1:2] = np.array([NAMES.index(name) for name in SHAPES])[kind]
    count = manner.size
    tracks = Tracks(
        first=np.arange(fibers + 1) * (2 * each + 1),
        time_s=np.zeros(count),
        curve=curve.reshape(count, 6),
        manner=manner.ravel(),
        shape=shape.ravel(),
        line=np.ones(count, dtype=np.int32),
        phrase_line=np.zeros(count, dtype=np.int32),
        duration_s=0.0,
    )
    lasts = np.max([least_durations(tracks, a) for a in abilities], axis=0).reshape(manner.shape)
    lasts *= np.where(random.random(lasts.shape) < 0.01, 0.7, random.uniform(1.1, 4.0, lasts.shape))
    lasts[:, 1::2] = random.uniform(0.1, 2.0, lasts[:, 1::2].shape)
    time_s = np.zeros(manner.shape)
    np.cumsum(lasts[:, :-1], axis=1, out=time_s[:, 1:])
    return dataclasses.replace(tracks, time_s=time_s.ravel(), duration_s=float(time_s.max()))


def cost_us(tracks: Tracks, rig: Rig, abilities: Abilities, repeats: int) -> tuple[float, int]:
    """Microseconds a move in the fastest of some checks, and how many snags it found."""
    least, found = np.inf, 0
    for _ in range(repeats):
        begun = time.perf_counter()
        found = len(check(tracks, rig, abilities).snags)
        least = min(least, time.perf_counter() - begun)
    return least / tracks.moves * 1e6, found


def main() -> None:
    """Print the table."""
    print(f"{'moves':>9} {'fibers':>7} {'rated us':>9} {'over first':>11} {'tables us':>10} {'over rated':>11} {'snags':>13}")
    base = 0.0
    for moves, fibers in SIZES[:2] if "--small" in sys.argv else SIZES:
        random = np.random.default_rng(moves)
        rig, even = rated(fibers)
        varied = modelled(even, random)
        tracks = score(moves, [even, varied], fibers, random)
        repeats = 2 if moves > 500_000 else 5
        plain, few = cost_us(tracks, rig, even, repeats)
        table, many = cost_us(tracks, rig, varied, repeats)
        base = base or plain
        print(
            f"{tracks.moves:>9} {fibers:>7} {plain:>9.2f} {plain / base:>11.2f} {table:>10.2f} {table / plain:>11.2f} "
            f"{few:>6} {many:>6}"
        )
    print(f"highest memory {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6:.2f} GB")


if __name__ == "__main__":
    main()
