"""Least costs against an independent formulation for Clarabel (Goulart and Chen 2024), written from the manual page alone."""

from itertools import pairwise

import cvxpy as cp
import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.retime.retiming import retime

from .scores import random_score

SEEDS = range(110)
HOLD, SUDDEN = 0, 2
BEND = {"smooth": (1.875, 10.0 / np.sqrt(3.0)), "linear": (1.0, 0.0), "swell": (2.0, 2.0), "settle": (2.0, 2.0)}
NAMES = ("smooth", "linear", "swell", "settle", "sudden")


def least_by_clarabel(made, stroke, fill, exhaust, accel, keep):
    """The least cost by a plain model: one variable a knot, equalities for what lands together; None where none fits."""
    tracks = made.tracks
    knots = len(tracks.time_s)
    t = cp.Variable(knots)
    wait = cp.Variable(knots)  # what a sudden move waits for, before it starts
    rules = [wait >= 0]
    landings: dict[float, list[tuple[int, float]]] = {}
    starts = []
    for f in range(len(tracks.first) - 1):
        a, b = tracks.first[f], tracks.first[f + 1]
        rules.append(t[a] == 0)
        for k in range(a, b - 1):
            way = tracks.curve[k, 1:].sum()
            rate = fill if way > 0 else exhaust
            if tracks.manner[k] == HOLD:
                rules.append(t[k + 1] >= t[k])
                continue
            if tracks.manner[k] == SUDDEN:
                rules.append(t[k + 1] == t[k] + wait[k] + abs(way) / rate)
                if k > a and tracks.manner[k - 1] == HOLD:
                    rules.append(wait[k] == 0)
            else:
                speed, bend = BEND[NAMES[tracks.shape[k]]]
                least = max(speed * abs(way) / rate, np.sqrt(bend * abs(way) / accel) if accel else 0.0)
                rules.append(t[k + 1] - t[k] >= least)
                if k > a and tracks.manner[k - 1] == HOLD:
                    starts.append((k, abs(way) / stroke / 20.0))
            landings.setdefault(round(tracks.time_s[k + 1], 7), []).append((k + 1, abs(way) / stroke))
    instants = sorted(landings)
    for instant in instants:
        first = landings[instant][0][0]
        rules += [t[other] == t[first] for other, _ in landings[instant][1:]]
    hit = {instant: t[landings[instant][0][0]] for instant in instants}
    rules += [hit[b] >= hit[a] for a, b in pairwise(instants)]
    for pin in made.pins_s:
        for instant in instants:
            rules += [hit[instant] == instant] if abs(instant - pin) < 1e-6 else []
            rules += [hit[instant] <= pin] if instant < pin - 1e-6 else []
            rules += [hit[instant] >= pin] if instant > pin + 1e-6 else []
    costs = []
    before, before_s = 0.0, 0.0
    for instant in instants:
        weight = sum(w for _, w in landings[instant])
        wanted = hit[instant] - instant if keep == "clock" else (hit[instant] - before) - (instant - before_s)
        costs.append(weight * cp.abs(wanted))
        before, before_s = hit[instant], instant
    for k, weight in starts:
        wanted = t[k] - tracks.time_s[k] if keep == "clock" else (t[k + 1] - t[k]) - (tracks.time_s[k + 1] - tracks.time_s[k])
        costs.append(weight * cp.abs(wanted))
    problem = cp.Problem(cp.Minimize(sum(costs)), rules)
    problem.solve(solver=cp.CLARABEL, tol_gap_abs=1e-10, tol_gap_rel=1e-10, tol_feas=1e-10)
    return problem.value if problem.status in ("optimal", "optimal_inaccurate") else None


@pytest.mark.parametrize("keep", ["clock", "rhythm"])
@pytest.mark.parametrize("seeds", [SEEDS[n : n + 10] for n in range(0, len(SEEDS), 10)], ids=lambda s: f"from_{s[0]}")
def test_random_small_scores_cost_what_an_independent_solver_finds(make_rig, seeds, keep):
    for seed in seeds:
        accel = (None, 2.0)[seed % 2]
        rig = make_rig(4, accel=accel)
        made = random_score(1000 + seed, fibers=4, moves=4)
        ours = retime(made.tracks, abilities_of(rig), rig, made.pins_s, keep)
        theirs = least_by_clarabel(made, 0.3, 0.6, 0.3, accel, keep)
        assert (theirs is None) == bool(ours.pins_short), seed
        if theirs is not None:
            assert ours.cost == pytest.approx(theirs, abs=1e-6, rel=1e-6), seed
            assert ours.bound == pytest.approx(ours.cost, abs=1e-8), seed
