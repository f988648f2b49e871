"""What landing on the count costs and buys: lateness at the hits and error on the way, with the inverse and without it.

python tests/bench/landing.py [--scores estuary gannet] [--rigs 5] [--off 0.1]

The score is retimed first, so that every hit can be made. Then it is simulated with the model right, and on rigs of which every
number of make, valve, tube and load is off by a share, up or down by chance; those with what boards sense corrected by the
trim, as in `play --trim`, in a first night and in a second that begins with what the first learned, and without. Lateness is
how long after the written instant a fiber passes 95 % of its move as written. On a rig that is off some hits cannot be made by
anybody: where the move takes longer than the score gives it on the rig as it is, or ends beyond what that can reach. They are
left out, and counted, as are moves by less than 1 % of stroke; hits never made by 95 % are counted beside, and are in no mean.
"""

import argparse
from dataclasses import fields, is_dataclass, replace
from pathlib import Path

import numpy as np

from composer.drive.inverse import LOOK_S, Inverse, is_valve_drive, standing
from composer.limits.abilities import abilities_of
from composer.limits.duration import least_durations
from composer.load import load_score
from composer.motion import motion_of, on_grid, strain_in
from composer.retime.retiming import retime
from composer.simulate.hits import LandingLog
from composer.simulate.rig import SimulatedRig
from composer.simulate.run import Block, tail_s
from composer.tracks import durations, end_strain
from player.engine.sensing import POINTS
from player.engine.trim import SLACK_S, Trim

DEMOS = Path(__file__).parents[2] / "scores_demo"

RATE_HZ = 200.0
SENSED_S = 0.05
"""How often what boards sense is looked at, as in the engine."""

PASSED, SEEN = 0.95, 0.01
"""The share of a move after which it counts as made; and of a stroke from which on a move is looked at."""

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


def simulate(tracks, rig, abilities, inverse, real, trim):
    """Time (T,), strain wanted and strain, (F, T), as a player sends to the rig that is there, and senses it."""
    tick = 1.0 / RATE_HZ
    motion, sender, simulated = motion_of(tracks, abilities), Inverse(rig, abilities, inverse), SimulatedRig(*real)
    early = int(np.ceil(sender.lead_s.max() / tick - 1e-9))
    number = np.arange(-early, int(np.ceil((tracks.duration_s + tail_s(abilities)) * RATE_HZ)) + 1)
    ends = (number + early + 1) * tick + (sender.lead_s - early * tick)[:, None]
    asked, soon, ahead = (on_grid(motion, ends + later, strain_in) for later in (0.0, sender.soon_s[:, None], LOOK_S))
    sent = sender.commands(asked, soon, ahead, tick)
    time = number * tick
    wanted = on_grid(motion, np.maximum(time, 0.0), strain_in)
    every, slack, stroke = round(SENSED_S / tick), round(SLACK_S / tick), abilities.stroke
    shares, ways, sends = (np.ascontiguousarray(part.T) for part in (wanted / stroke[:, None], asked / stroke[:, None], sent))
    strain, fibers, frozen = np.empty(wanted.shape), np.arange(tracks.fibers), np.zeros(tracks.fibers, dtype=bool)
    for column in range(len(time)):
        strain[:, column], now = simulated.strain, sends[column]
        if trim is not None:
            if column % every == 0:
                zone = shares[max(column - slack, 0) : column + slack + 1]
                trim.sense(time[column], fibers, strain[:, column] / stroke, zone.min(axis=0), zone.max(axis=0), frozen)
            now = trim.applied(now, ways[column])
        simulated.step(tick, now)
    shown = time >= 0.0
    return time[shown], wanted[:, shown], strain[:, shown]


def landings(tracks, abilities, time, wanted, strain):
    """Where and how late fibers landed."""
    log, none = LandingLog(tracks, abilities.stroke), np.zeros(len(time))
    log.add(Block(time, wanted, strain, np.zeros(strain.shape), none, none, 0.0))
    return log.landings()


def possible(tracks, landed, abilities):
    """(H,) the hits that fibers of these abilities can make as written, and get to 95 % of, and are big enough to be seen."""
    of = landed.segment
    way = end_strain(tracks)[of] - tracks.curve[of, 0]
    goal = tracks.curve[of, 0] + PASSED * way
    in_time = least_durations(tracks, abilities)[of] <= durations(tracks)[of] * (1.0 + 1e-6)
    stroke = abilities.stroke[landed.fiber]
    return in_time & (goal <= stroke) & (np.abs(way) > SEEN * stroke)


def nights(rig, abilities, off):
    """What is played on a rig: its name and, for a player with the inverse and one without, the trim that it begins with."""
    yield "no", (None, None)
    if off:
        pair = tuple(Trim(standing(rig, abilities, POINTS), ~is_valve_drive(rig)) for _ in range(2))
        yield "1st", pair
        again = tuple(Trim(standing(rig, abilities, POINTS), ~is_valve_drive(rig)) for _ in range(2))
        for trim, earlier in zip(again, pair, strict=True):
            trim.begin_with(earlier.by)
        yield "2nd", again


def main():
    """Print the table."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--scores", nargs="+", default=["estuary", "gannet"])
    parser.add_argument("--rigs", type=int, default=5)
    parser.add_argument("--first", type=int, default=1, help="number of the first draw")
    parser.add_argument("--off", type=float, default=0.1)
    options = parser.parse_args()
    print(f"{'score':<9}{'rig':<13}{'trim':<6}{'hits':>6}{'cannot':>8}{'late, mean ms':>24}{'never':>15}{'error, rms %':>26}")
    print(f"{'':<42}{'with':>8}{'without':>8}{'ratio':>8}{'with':>7}{'without':>8}{'with':>9}{'without':>9}{'ratio':>8}")
    for name in options.scores:
        loaded = load_score(str(DEMOS / f"{name}.score"))
        tracks = retime(loaded.tracks, loaded.abilities, loaded.rig, loaded.pins_s, loaded.score.keep).tracks
        rigs = [("right", (loaded.rig, loaded.abilities), False)] if options.first == 1 else []
        for seed in range(options.first - 1, options.first - 1 + options.rigs):
            real = rig_off(loaded.rig, options.off, seed)
            rigs.append((f"off, draw {seed + 1}", (real, abilities_of(real)), True))
        for said, real, off_by in rigs:
            for night, trims in nights(loaded.rig, loaded.abilities, off_by):
                late, never, error = [], [], []
                for inverse, trim in zip((True, False), trims, strict=True):
                    time, wanted, strain = simulate(tracks, loaded.rig, loaded.abilities, inverse, real, trim)
                    landed = landings(tracks, loaded.abilities, time, wanted, strain)
                    can = possible(tracks, landed, real[1])
                    made = can & ~np.isnan(landed.late_s)
                    late.append(1e3 * landed.late_s[made].mean())
                    never.append(np.count_nonzero(can & ~made))
                    error.append(100.0 * np.sqrt((((strain - wanted) / loaded.abilities.stroke[:, None]) ** 2).mean()))
                ratio = late[1] / late[0] if late[0] else np.inf if late[1] else np.nan
                print(
                    f"{name:<9}{said:<13}{night:<6}{len(can):>6}{np.count_nonzero(~can):>8}"
                    f"{late[0]:>8.2f}{late[1]:>8.2f}{ratio:>8.1f}{never[0]:>7}{never[1]:>8}"
                    f"{error[0]:>9.2f}{error[1]:>9.2f}{error[1] / error[0]:>8.1f}",
                    flush=True,
                )


if __name__ == "__main__":
    main()
