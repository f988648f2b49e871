"""What landing on the count costs and buys: lateness at the hits and error on the way, with the inverse and without it.

python tests/bench/landing.py [--scores estuary gannet] [--rigs 5] [--off 0.1]

The score is retimed first, so that every hit can be made. Then it is simulated with the model right, and on rigs of which every
number of make, valve, tube and load is off by a share, up or down by chance. Lateness is how long after the written
instant a fiber has done 95 % of its move, from where it stood to where it comes to stand: on a rig that is off that is not
quite where the score has it, which the error on the way shows. Beside: how far in time, early or late, from where
the score itself passes 95 %.
"""

import argparse
from dataclasses import fields, is_dataclass, replace
from pathlib import Path

import numpy as np

from composer.limits.abilities import abilities_of
from composer.load import load_score
from composer.retime.retiming import retime
from composer.simulate.run import blocks
from composer.tracks import HOLD

DEMOS = Path(__file__).parents[2] / "scores_demo"

RATE_HZ = 200.0
PASSED = 0.95
READY_S = 0.05
"""A fiber is looked at from so long before its move, as a lead shows before the score does."""

KEPT = {"max_pressure_kPa", "rated_cycles", "rest_length_mm", "max_switch_Hz", "duty", "duty_burst_s"}
"""Numbers that say what is allowed, not how a fiber moves; and its length, which strain is a share of."""


def off(thing, share, chance):
    """The dataclass with every number of it up or down by a share."""
    changed = {}
    for field in fields(thing):
        value = getattr(thing, field.name)
        if is_dataclass(value):
            changed[field.name] = off(value, share, chance)
        elif isinstance(value, float) and field.name not in KEPT:
            changed[field.name] = value * (1.0 + share * chance.choice([-1.0, 1.0]))
    return replace(thing, **changed)


def rig_off(rig, share, seed):
    """The rig as it might hang in truth: each make, each valve, each tube and load off by a share; the supply as it is."""
    chance = np.random.default_rng(seed)
    types = {name: replace(kind, make=off(kind.make, share, chance)) for name, kind in rig.fiber_types.items()}
    valves = {name: off(valve, share, chance) for name, valve in rig.valve_types.items()}
    fed = {}
    fibers = []
    for fiber in rig.fibers:
        key = (fiber.type.name, fiber.mounting)
        if key not in fed:
            ways = {
                name: getattr(fiber.mounting, name) * (1.0 + share * chance.choice([-1.0, 1.0]))
                for name in ("tube_bore_mm", "tube_length_mm", "load_N")
            }
            fed[key] = replace(fiber.mounting, valve=valves[fiber.mounting.valve.name], **ways)
        fibers.append(replace(fiber, type=types[fiber.type.name], mounting=fed[key]))
    return replace(rig, fiber_types=types, valve_types=valves, fibers=tuple(fibers))


def measure(tracks, rig, abilities, inverse, real):
    """Mean lateness in ms, mean distance in time from the score in ms, and root mean square error in % of stroke."""
    parts = [(b.time_s, b.target, b.strain) for b in blocks(tracks, rig, abilities, RATE_HZ, inverse, real)]
    time, target, strain = (np.concatenate(part, axis=-1) for part in zip(*parts, strict=True))
    late, beside = [], []
    for fiber in range(tracks.fibers):
        knots = slice(tracks.first[fiber], tracks.first[fiber + 1])
        begins, manner = tracks.time_s[knots], tracks.manner[knots]
        for move in np.flatnonzero(manner[:-1] != HOLD):
            if manner[move + 1] != HOLD:
                continue  # it goes on: where it would have come to stand is not to be seen
            stands = begins[move + 2] if move + 2 < len(begins) else time[-1]
            window = slice(np.searchsorted(time, begins[move] - READY_S), np.searchsorted(time, stands - READY_S))
            real_s, wanted_s = passes(time[window], strain[fiber, window]), passes(time[window], target[fiber, window])
            if real_s is not None and wanted_s is not None:
                late.append(max(real_s - begins[move + 1], 0.0))
                beside.append(abs(real_s - wanted_s))
    wrong = (strain - target) / abilities.stroke[:, None]
    return 1e3 * np.mean(late), 1e3 * np.mean(beside), 100.0 * np.sqrt((wrong**2).mean())


def passes(time, strain):
    """When a fiber has done 95 % of the way from its first to its last strain in a window; None where it does not move."""
    way = strain[-1] - strain[0]
    if len(time) < 2 or abs(way) < 1e-3:
        return None
    done = (strain - strain[0]) / way
    at = int(np.argmax(done >= PASSED))
    return time[at] - (done[at] - PASSED) / max(done[at] - done[at - 1], 1e-12) * (time[at] - time[at - 1])


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--scores", nargs="+", default=["estuary", "gannet"])
    parser.add_argument("--rigs", type=int, default=5)
    parser.add_argument("--off", type=float, default=0.1)
    options = parser.parse_args()
    print(f"{'score':<10}{'rig':<16}{'late, mean ms':>24}{'beside, mean ms':>24}{'error, rms % of stroke':>26}")
    print(f"{'':<26}" + f"{'with':>8}{'without':>8}{'ratio':>8}" * 2 + f"{'with':>10}{'without':>8}{'ratio':>8}")
    for name in options.scores:
        loaded = load_score(str(DEMOS / f"{name}.score"))
        tracks = retime(loaded.tracks, loaded.abilities, loaded.rig, loaded.pins_s, loaded.score.keep).tracks
        rigs = [("as modelled", None)]
        for seed in range(options.rigs):
            real = rig_off(loaded.rig, options.off, seed)
            rigs.append((f"off, draw {seed + 1}", (real, abilities_of(real))))
        for said, real in rigs:
            on, no = (measure(tracks, loaded.rig, loaded.abilities, inverse, real) for inverse in (True, False))
            row = "".join(f"{a:>8.2f}{b:>8.2f}{b / a if a else np.inf:>8.1f}" for a, b in zip(on, no, strict=True))
            print(f"{name:<10}{said:<16}{row}", flush=True)


if __name__ == "__main__":
    main()
