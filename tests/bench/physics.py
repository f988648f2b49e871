"""Physics: what tables, the simulated rig and checking cost, each as a ratio of two things timed in this run.

python tests/bench/physics.py
"""

import sys
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
from scipy.integrate import solve_ivp

sys.path.insert(0, str(Path(__file__).parents[2]))

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.limits.tables import tables_of
from composer.rig.reading import read_rig
from composer.rig.select import Selector
from composer.score.expand import expand
from composer.score.reading import read_score
from composer.simulate.rig import SimulatedRig
from tests.composer.fiber import stiff
from tests.composer.fiber.makes import CORD, PLEAT, mounted
from tests.composer.fiber.rigs import rig_of, table
from tests.composer.fiber.test_rates import stiff_fiber
from tests.composer.simulate.test_modelled import stiff_run

DROP = """
[fiber_type.drop]
kind = "rated"
direction = "contract"
rest_length_mm = 400
stroke = 0.24
fill_rate_per_s = 0.2
exhaust_rate_per_s = 0.1
air_mL = 30
"""

SMALL = "--small" in sys.argv
MANY = 512 if SMALL else 4096


def seconds(work, repeats=5):
    """The least processor time of several runs."""
    best = np.inf
    for _ in range(1 if SMALL else repeats):
        begin = time.process_time()
        work()
        best = min(best, time.process_time() - begin)
    return best


def rig_with(makes, count, receiver_L=1000.0):
    """A rig of `count` fibers, its makes in turn, row by row."""
    head = rig_of("contractile", CORD).split("[fiber_type")[0].replace("receiver_L = 10", f"receiver_L = {receiver_L:g}")
    types = "\n".join(table(f"m{n}", kind, make) for n, (kind, make) in enumerate(makes))
    each = count // len(makes)
    rows = [
        f'[[fibers]]\nname = "r{n}"\ncount = {each}\nfirst_channel = {n * each}\ntype = "m{n}"\nload_N = 0.5\n'
        for n in range(len(makes))
    ]
    return read_rig("\n".join([head, types, *rows]), "bench.rig.toml")


def tables():
    """4096 fibers of 16 makes over 16 fibers of them."""
    makes = [("contractile", replace(CORD, rest_length_mm=300.0 + 10.0 * n)) for n in range(16)]
    few, many = (rig_with(makes, count) for count in (16, MANY))
    ratio = seconds(lambda: abilities_of(many), 3) / seconds(lambda: abilities_of(few), 3)
    print(f"rate tables, {MANY} fibers of 16 makes over 16 fibers: {ratio:.2f} times (2 at most)")


def wishes(count, ticks, every):
    """Set-points (pieces, fibers), each for `every` ticks."""
    return np.random.default_rng(7).uniform(0.0, 1.0, (-(-ticks // every), count))


def real_time():
    """Simulated seconds over seconds of one core."""
    makes = [("contractile", CORD), ("extensile", PLEAT)]
    for count, least in ((48, 20), (512, 2)):
        rig = rig_with(makes, count)
        abilities = abilities_of(rig)
        sent = wishes(count, 1000, 50)

        def run(rig=rig, abilities=abilities, sent=sent):
            sim = SimulatedRig(rig, abilities)
            for number in range(1000):
                sim.step(0.002, sent[number // 50])

        print(f"simulated rig, {count} fibers at 500 Hz: {2.0 / seconds(run):.0f} times real time ({least} at least)")


def together(fibers, P, e, s, goals, supply, begin, end, at):
    """All fibers as the one system that they are, by LSODA, from `begin` to `end` at constant set-points: P, e, s (T, F)."""
    count = len(fibers)
    filling = goals > P
    holds = [fiber.holds("in" if way else "out") for fiber, way in zip(fibers, filling, strict=True)]

    def strains(P):
        found = np.array([np.interp(P[n], holds[n], fibers[n].e) for n in range(count)])
        return np.where(filling, np.maximum(e, found), np.minimum(e, found))

    def change(t, y):
        P, s = y[:count], y[count:]
        now = strains(P)
        rate = np.zeros(count)
        for n, fiber in enumerate(fibers):
            left = goals[n] - P[n]
            if (left > 0.0) != filling[n]:
                continue
            edge = np.interp(P[n], holds[n], fiber.e)
            moving = (edge > e[n] if filling[n] else edge < e[n]) and holds[n][0] < P[n] < holds[n][-1]
            swell = 0.0
            if moving:
                point = int(np.clip(np.searchsorted(fiber.e, now[n]), 1, len(fiber.e) - 1))
                slope = (holds[n][point] - holds[n][point - 1]) / (fiber.e[point] - fiber.e[point - 1])
                swell = fiber.count * np.interp(now[n], fiber.e, fiber.dV) / slope
            p = P[n] + fiber.ambient
            ways = (supply + fiber.ambient, p, True) if filling[n] else (p, fiber.ambient, False)
            flow = stiff.way_flow(fiber, *ways) * np.sign(left) * min(1.0, abs(left) / 200.0)
            rate[n] = fiber.n * stiff.R * stiff.T * flow / (fiber.gas(now[n]) + fiber.n * p * swell)
        return np.concatenate([rate, (now - s) / np.array([fiber.settle for fiber in fibers])])

    found = solve_ivp(change, (begin, end), np.concatenate([P, s]), method="LSODA", rtol=1e-6, atol=1e-3, t_eval=at)
    return found.y[:count, -1], strains(found.y[:count, -1]), found.y[count:, -1], found.y[count:].T


def against_solve_ivp():
    """The same 48 fibers by LSODA at rtol 1e-6, as one system and one by one, and how far apart the strains are."""
    makes = [("contractile", CORD), ("extensile", PLEAT)]
    rig = rig_with(makes, 48)
    abilities = abilities_of(rig)
    sent = wishes(48, 1500, 250)
    strains = np.zeros((1501, 48))

    def run(ticks):
        sim = SimulatedRig(rig, abilities)
        for number in range(ticks):
            sim.step(0.002, sent[number // 250])
            strains[number + 1] = sim.strain

    ours = seconds(lambda: run(1500), 3)
    times = np.arange(1501) * 0.002
    worst, theirs = 0.0, 0.0
    shared = [stiff_fiber(make, mounted(load_N=0.5, tube_length_mm=1000.0)) for _, make in makes]
    fibers = [shared[index // 24] for index in range(48)]
    limits = np.array([makes[index // 24][1].max_pressure_kPa * 1e3 for index in range(48)])
    delays = [fiber.mounting.valve.switch_ms * 1e-3 for fiber in rig.fibers]
    delays = [one + abilities.capabilities[make].physics.delay for one, make in zip(delays, abilities.which, strict=True)]
    for index, fiber in enumerate(fibers):
        if SMALL and index % 24:
            continue
        sequence = [(0.5 * piece, share) for piece, share in enumerate(sent[:, index])]
        begin = time.process_time()
        _, expected = stiff_run(fiber, sequence, limits[index], 400e3, times, delays[index])
        theirs += time.process_time() - begin
        worst = max(worst, np.max(np.abs(expected - strains[:, index])) / abilities.stroke[index])
    begin = time.process_time()
    rest = np.zeros(48)
    goals = np.minimum(sent[0] * limits, 400e3)
    last = 25 if SMALL else 250
    ends = together(fibers, rest, rest, rest, goals, 400e3, delays[0], 0.002 * last, times[6:last])[3]
    as_one = (time.process_time() - begin) / (0.002 * last - delays[0])
    apart = np.max(np.abs(ends[-1] - strains[last - 1]) / abilities.stroke)
    print(f"simulated rig to LSODA (rtol 1e-6), 48 fibers as one: {as_one / (ours / 3.0):.0f} times as fast (50 at least)")
    print(f"   over 48 solutions of one fiber each, without their common supply: {theirs / ours:.0f} times")
    print(f"   largest difference of strain: {100.0 * max(worst, apart):.2f} % of stroke (1 at most)")


def checking():
    """The same score on modelled and on rated fibers."""
    score = read_score(
        "tempo 96\nphrase surge 32\n  0 rest\n  8 0.6 swell\n  12 0.5 linear\n  20 0.9 smooth over 4\n  22 0.3 sudden\n"
        "  32 rest settle\n"
        "section all at 1:1\n  reed.* surge times 40 every 34 canon 1/16\n",
        "bench.score",
        None,
    )
    took = []
    text = rig_of("contractile", CORD, count=48).replace("receiver_L = 10", "receiver_L = 1000")
    for rig in (read_rig(text, "f"), read_rig(text.replace('type = "one"', 'type = "drop"') + DROP, "f")):
        abilities = abilities_of(rig)
        tracks = expand(score, rig, abilities, Selector(rig, {}))
        tables_of(abilities)
        took.append(seconds(lambda tracks=tracks, rig=rig, abilities=abilities: check(tracks, rig, abilities)))
        print(f"   {tracks.moves} moves, {len(check(tracks, rig, abilities).snags)} snags")
    print(f"checking a score on modelled fibers over rated ones: {took[0] / took[1]:.2f} times (3 at most)")


if __name__ == "__main__":
    tables()
    real_time()
    against_solve_ivp()
    checking()
