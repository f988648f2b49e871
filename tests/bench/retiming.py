"""How fast retiming is, as ratios in one run: against one HiGHS dual-simplex solve of the same programme, assembled here.

python tests/bench/retiming.py [--moves 33000] [--fibers 64] [--too-fast 0.05], or with --million for 10⁶ moves on 4096
fibers beside the whole solve of 33 000 moves.
"""

import argparse
import platform
import resource
import sys
import time
from collections import Counter
from dataclasses import replace
from pathlib import Path

import numpy as np
import toppra
from scipy import sparse
from scipy.optimize import linprog
from toppra import algorithm, constraint

sys.path.insert(0, str(Path(__file__).parents[1]))

from conftest import make_rig

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.limits.duration import least_durations
from composer.load import load_score
from composer.retime.retimer import Choices, Retimer
from composer.retime.retiming import retime
from composer.retime.rows import AIR_ROW, DUTY_ROW
from composer.shapes import PROGRESS
from composer.tracks import HOLD, MOVE, Tracks

STROKE, FILL, EXHAUST = 0.3, 0.6, 0.3


def big_score(moves: int, fibers: int, too_fast: float, seed: int = 1) -> Tracks:
    """Moves of many fibers on a grid of quarter counts, a share of them too fast; about half follow a hold."""
    rng = np.random.default_rng(seed)
    first, times, curves, manners, shapes = [0], [], [], [], []
    for _ in range(fibers):
        at, value = 0.25 * float(rng.integers(0, 8)), 0.0
        if at > 0.0:
            times.append(0.0), curves.append(np.zeros(6)), manners.append(HOLD), shapes.append(-1)
        for _ in range(moves // fibers):
            target = rng.uniform(0.0, STROKE)
            way = target - value
            needs = 1.875 * abs(way) / (FILL if way > 0 else EXHAUST)
            counts = np.ceil(needs / 0.25) + rng.integers(0, 4)
            if rng.random() < too_fast:
                counts = max(1.0, np.floor(needs * 0.7 / 0.25))
            curve = way * PROGRESS["smooth"]
            curve[0] += value
            times.append(at), curves.append(curve), manners.append(MOVE), shapes.append(0)
            at, value = at + 0.25 * counts, target
            if rng.random() < 0.5:
                times.append(at), manners.append(HOLD), shapes.append(-1)
                curves.append(np.array([value, 0, 0, 0, 0, 0]))
                at += 0.25 * float(rng.integers(1, 6))
        times.append(at), manners.append(HOLD), shapes.append(-1), curves.append(np.array([value, 0, 0, 0, 0, 0]))
        first.append(len(times))
    count = len(times)
    return Tracks(
        np.array(first), np.array(times), np.array(curves), np.array(manners, np.int8), np.array(shapes, np.int8),
        np.ones(count, np.int32), np.ones(count, np.int32), float(max(times)),
    )  # fmt: skip


def with_rests(moves: int, fibers: int, too_fast: float, seed: int = 2) -> Tracks:
    """As above in passages of twelve moves a fiber with rests between them, what is too fast gathered in a few passages."""
    passages = max(1, moves // fibers // 12)
    rng = np.random.default_rng(seed)
    hurried = set(rng.choice(passages, max(1, round(passages * too_fast / 0.5)), replace=False).tolist())
    parts = [big_score(12 * fibers, fibers, 0.5 if n in hurried else 0.0, seed + n) for n in range(passages)]
    began = np.concatenate(([0.0], np.cumsum([np.ceil(part.duration_s) + 2.0 for part in parts])))
    first, times, curves, manners, shapes = [0], [], [], [], []
    for f in range(fibers):
        for part, at in zip(parts, began, strict=False):
            mine = slice(part.first[f], part.first[f + 1])
            curve, manner, time_s = part.curve[mine], part.manner[mine].copy(), part.time_s[mine] + at
            # Each passage begins and ends at rest: back there in two seconds, which every fiber can.
            times += [*time_s, time_s[-1] + 2.0]
            back = curve[-1, 0] * PROGRESS["smooth"] * -1.0
            back[0] += curve[-1, 0]
            curves += [*curve[:-1], back, np.zeros(6)]
            manners += [*manner[:-1], MOVE, HOLD]
            shapes += [*part.shape[mine][:-1], 0, -1]
        first.append(len(times))
    # The rest of one passage and the wait before the next are one hold.
    manner, owner = np.array(manners, np.int8), np.repeat(np.arange(fibers), np.diff(first))
    twice = np.concatenate(([False], (manner[1:] == HOLD) & (manner[:-1] == HOLD) & (owner[1:] == owner[:-1])))
    kept = np.flatnonzero(~twice)
    counts = np.bincount(owner[kept], minlength=fibers)
    time_s = np.array(times)[kept]
    return Tracks(
        np.concatenate(([0], np.cumsum(counts))), time_s, np.array(curves)[kept], manner[kept],
        np.array(shapes, np.int8)[kept], np.ones(len(kept), np.int32), np.ones(len(kept), np.int32), float(time_s.max()),
    )  # fmt: skip


def by_hand(tracks: Tracks, abilities, keep: str) -> tuple[float, float]:
    """Seconds of one whole-score solve, assembly left out, and its cost."""
    least = least_durations(tracks, abilities)
    weight = np.abs(tracks.curve[:, 1:].sum(axis=1)) / STROKE
    instants: dict[float, int] = {}
    knots = []
    for f in range(tracks.fibers):
        for k in range(tracks.first[f] + 1, tracks.first[f + 1]):
            if tracks.manner[k - 1] != HOLD:
                knots.append(tracks.time_s[k])
    for instant in np.unique(knots):
        instants[float(instant)] = len(instants)
    written = list(instants)
    price = [0.0] * len(written)
    rows, columns, values, bound = [], [], [], []
    starts, m = [], 0

    def row(later, earlier, least_s):
        nonlocal m
        rows.append(m), columns.append(later), values.append(-1.0)
        if earlier is not None:
            rows.append(m), columns.append(earlier), values.append(1.0)
        bound.append(-least_s)
        m += 1

    for f in range(tracks.fibers):
        at = None
        for k in range(tracks.first[f], tracks.first[f + 1] - 1):
            if tracks.manner[k] == HOLD:
                start = len(written)
                written.append(tracks.time_s[k + 1])
                price.append(weight[k + 1] / 20.0)
                row(start, at, 0.0)
                starts.append((start, instants[float(tracks.time_s[k + 2])]) if k + 2 < tracks.first[f + 1] else (start, start))
                at = start
            else:
                hit = instants[float(tracks.time_s[k + 1])]
                price[hit] += weight[k]
                row(hit, at, least[k])
                at = hit
    for h in range(1, len(instants)):
        row(h, h - 1, 0.0)
    n, hits = len(written), len(instants)
    written, price = np.array(written), np.array(price)
    behind = np.full(n, -1)
    if keep == "rhythm":
        behind[:hits] = np.arange(hits) - 1
        for start, hit in starts:
            behind[start] = hit
    line = np.arange(n)
    has = behind >= 0
    apart = sparse.csr_array((np.ones(n), (line, line)), shape=(n, n))
    apart = apart - sparse.csr_array((np.ones(has.sum()), (line[has], behind[has])), shape=(n, n))
    ties = sparse.hstack([apart, -sparse.eye_array(n), sparse.eye_array(n)], format="csr")
    above = sparse.csr_array((values, (rows, columns)), shape=(m, 3 * n))
    wanted = apart @ written
    began = time.process_time()
    found = linprog(
        np.concatenate((np.zeros(n), price, price)), A_ub=above, b_ub=np.array(bound), A_eq=ties, b_eq=wanted,
        bounds=(0.0, None), method="highs-ds",
    )  # fmt: skip
    return time.process_time() - began, float(found.fun)


def main() -> None:
    parser = argparse.ArgumentParser()
    parser.add_argument("--moves", type=int, default=33000)
    parser.add_argument("--fibers", type=int, default=64)
    parser.add_argument("--too-fast", type=float, default=0.05)
    parser.add_argument("--million", action="store_true")
    parser.add_argument("--small", action="store_true", help="a twentieth of everything")
    options = parser.parse_args()
    if options.million:
        million()
        return
    edited()
    one_path(50 if options.small else 1000)
    with_cuts(*(1_600, 16) if options.small else (33_000, 64))
    moves, fibers, share = options.moves, options.fibers, options.too_fast
    if options.small:
        moves, fibers = 1600, 16
    rig = make_rig.__wrapped__()(fibers)
    abilities = abilities_of(rig)
    # Not every move that is given little time has too little, so more are given that.
    for says, tracks in (
        ("without a rest", big_score(moves, fibers, 1.55 * share)),
        ("in passages", with_rests(moves, fibers, 1.7 * share)),
    ):
        least = least_durations(tracks, abilities)
        lasts = np.diff(tracks.time_s, append=0.0)
        fast = np.count_nonzero((tracks.manner == MOVE) & (lasts < least * (1.0 - 1e-6))) / tracks.moves
        print(f"{says}: {tracks.moves} moves on {fibers} fibers, {fast:.1%} too fast; "
              f"{platform.machine()}, Python {platform.python_version()}")  # fmt: skip
        for keep in ("clock", "rhythm"):
            compare(tracks, abilities, rig, keep)


def edited() -> None:
    """Two lines: one number of Estuary changed, over its first retiming; the same with the text read and expanded again."""
    loaded = load_score(str(Path(__file__).parents[2] / "scores_demo" / "estuary.score"))
    tracks = loaded.tracks
    first_s = np.inf
    for _ in range(3):
        began = time.process_time()
        first = Retimer.of(tracks, loaded.abilities, loaded.rig, Choices(loaded.pins_s, give_s=loaded.pins_give_s))
        first_s = min(first_s, time.process_time() - began)
    again = []
    whole = np.flatnonzero((tracks.manner[:-1] == MOVE) & (tracks.shape[:-1] >= 0) & (tracks.manner[1:] == HOLD))
    for k in whole[:: max(1, len(whole) // 9)]:
        curve = tracks.curve.copy()
        curve[k, 1:] *= 0.9
        curve[k + 1, 0] = curve[k].sum()
        best = np.inf
        for _ in range(3):
            began = time.process_time()
            first.edited(replace(tracks, curve=curve))
            best = min(best, time.process_time() - began)
        again.append(best)
    path = str(Path(__file__).parents[2] / "scores_demo" / "estuary.score")
    began = time.process_time()
    load_score(path)
    read_s = time.process_time() - began
    print(f"reading and expanding all of Estuary again / first retiming = {read_s / first_s:.3f}")
    print(f"edit of Estuary / first retiming = {np.median(again) / first_s:.3f} ({first_s * 1e3:.0f} ms first)")


def with_cuts(moves: int, fibers: int) -> None:
    """Two lines: a score short of coil, and of air, over the same score with plenty of both."""
    tracks = with_rests(moves, fibers, 0.05)
    times, base = {}, None
    for name, more in (
        ("plenty", {}),
        ("duty", {"duty": 0.76, "duty_burst_s": 4.0}),
        ("air", {"air_mL": 30.0, "receiver_L": 0.042, "compressor_L_min": 36.0}),
    ):
        rig = make_rig.__wrapped__()(fibers, **more)
        abilities = abilities_of(rig)
        asked = Counter(snag.kind for snag in check(tracks, rig, abilities).snags)
        best = np.inf
        for _ in range(3):
            began = time.process_time()
            found = retime(tracks, abilities, rig, np.empty(0))
            best = min(best, time.process_time() - began)
        times[name], base = best, base or found.cost
        left = Counter(snag.kind for snag in check(found.tracks, rig, abilities).snags)
        kind = DUTY_ROW if name == "duty" else AIR_ROW
        binds = int(np.count_nonzero((found.proof.rows.kind == kind) & (found.proof.dual > 1e-9)))
        print(f"  {tracks.moves} moves, {name}: {best / times['plenty']:.2f} x the time with plenty; "
              f"as written {asked.total()} snags ({_counted(asked)}), {binds} rows of it hold; "
              f"cost {found.cost:.6g}, {found.cost - base:.3g} more, bound {found.bound:.6g}; "
              f"{left.total()} snags left{' (' + _counted(left) + ')' if left else ''}")  # fmt: skip


def _counted(kinds: Counter) -> str:
    """How many of each kind of snag, as words."""
    return ", ".join(f"{count} {kind}" for kind, count in sorted(kinds.items()))


def one_path(moves: int) -> None:
    """One line: a path of rate limits alone against toppra on as coarse a grid as gives the same duration to a thousandth."""
    fill, exhaust = 0.6, 0.25
    rng = np.random.default_rng(0)
    rig = make_rig.__wrapped__()(1, fill=fill, exhaust=exhaust)
    abilities = abilities_of(rig)
    times, value, curves = [0.0], 0.0, []
    for target in rng.uniform(0.02, STROKE, moves):
        curve = (target - value) * PROGRESS["smooth"]
        curve[0] += value
        curves.append(curve), times.append(times[-1] + 1e-4)
        value = target
    curves.append(np.array([value, 0, 0, 0, 0, 0]))
    count = len(curves)
    tracks = Tracks(
        np.array([0, count]), np.array(times), np.array(curves), np.array([MOVE] * (count - 1) + [HOLD], np.int8),
        np.array([0] * (count - 1) + [-1], np.int8), np.ones(count, np.int32), np.ones(count, np.int32), times[-1],
    )  # fmt: skip
    retime(tracks, abilities, rig, np.empty(0))
    ours_s = np.inf
    for _ in range(5):
        began = time.process_time()
        ours = float(retime(tracks, abilities, rig, np.empty(0)).tracks.time_s[-1])
        ours_s = min(ours_s, time.process_time() - began)

    def theirs(points: int) -> tuple[float, float]:
        began, lasts = time.process_time(), 0.0
        for curve in curves[:-1]:
            u = np.linspace(0.0, 1.0, 21)
            path = toppra.SplineInterpolator(u, np.polyval(curve[::-1], u)[:, None])
            rate = constraint.JointVelocityConstraint(np.array([[-exhaust, fill]]))
            grid = np.linspace(0.0, 1.0, points)
            lasts += pace_time(algorithm.TOPPRA([rate], path, gridpoints=grid, parametrizer="ParametrizeConstAccel"), curve)
        return lasts, time.process_time() - began

    def pace_time(solver, curve) -> float:
        # Each move at one pace, which is what a score asks for: the grid's slowest point sets it.
        grid = solver.gridpoints
        speed = np.abs(np.polyval((curve[1:] * np.arange(1.0, 6.0))[::-1], grid))
        limit = np.sqrt(np.maximum(solver.compute_feasible_sets()[:, 1], 0.0))
        there = speed > 1e-9
        return float((1.0 / limit[there]).max())

    for points in (5, 9, 17, 33, 65, 129, 257):
        lasts, theirs_s = theirs(points)
        if abs(lasts / ours - 1.0) <= 1e-3:
            theirs_s = min(theirs_s, theirs(points)[1], theirs(points)[1])
            break
    print(f"one path of {count - 1} moves: toppra / ours = {theirs_s / ours_s:.0f} at {points} points a move "
          f"({abs(lasts / ours - 1.0):.1e} apart in duration)")  # fmt: skip


def million() -> None:
    """One line: 10⁶ moves on 4096 fibers, 1 % too fast, over the whole solve of 33 000 moves on 64."""
    small = make_rig.__wrapped__()(64)
    theirs_s, _ = by_hand(big_score(33000, 64, 1.55 * 0.05), abilities_of(small), "clock")
    rig = make_rig.__wrapped__()(4096, receiver_L=1000.0, compressor_L_min=4000.0)
    tracks = with_rests(1_000_000, 4096, 1.7 * 0.01)
    began = time.process_time()
    found = retime(tracks, abilities_of(rig), rig, np.empty(0))
    ours_s = time.process_time() - began
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20
    print(f"{tracks.moves} moves on 4096 fibers / whole solve of 33 000 moves = {ours_s / theirs_s:.2f} "
          f"({ours_s:.0f} s, {theirs_s:.1f} s); {len(found.hits_moved)} hits moved; at most {peak:.2f} GB")  # fmt: skip


def compare(tracks: Tracks, abilities, rig, keep: str) -> None:
    """One line: our time over that of one solve of the whole, and both costs."""
    best = np.inf
    for _ in range(3):
        began = time.process_time()
        ours = retime(tracks, abilities, rig, np.empty(0), keep)
        best = min(best, time.process_time() - began)
    theirs_s, theirs = min(by_hand(tracks, abilities, keep) for _ in range(2))
    print(f"  {keep}: ours / whole solve = {best / theirs_s:.3f} ({best:.2f} s, {theirs_s:.2f} s); "
          f"cost {ours.cost:.9g}, apart {abs(ours.cost - theirs) / theirs:.1e}; bound {ours.bound:.9g}")  # fmt: skip


if __name__ == "__main__":
    main()
