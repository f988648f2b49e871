"""A single path with rate limits against toppra (Pham and Pham 2018): as fast as it goes, to a thousandth."""

import numpy as np
import pytest
import toppra
from toppra import algorithm, constraint

from composer.limits.abilities import abilities_of
from composer.retime.retiming import retime

from .scores import tracks_of

FILL, EXHAUST = 0.6, 0.25


def fastest_by_toppra(curve: np.ndarray) -> float:
    """Least seconds for a straight strain path, entered and left at full rate; the bound on acceleration binds nowhere."""
    u = np.linspace(0.0, 1.0, 21)
    path = toppra.SplineInterpolator(u, np.polyval(curve[::-1], u)[:, None])
    rate = constraint.JointVelocityConstraint(np.array([[-EXHAUST, FILL]]))
    bend = constraint.JointAccelerationConstraint(np.array([[-1e3, 1e3]]))
    solver = algorithm.TOPPRA([rate, bend], path, gridpoints=np.linspace(0.0, 1.0, 201), parametrizer="ParametrizeConstAccel")
    pace = (FILL if curve[1] > 0.0 else EXHAUST) / abs(curve[1]) * (1.0 - 1e-6)
    return float(solver.compute_trajectory(pace, pace).duration)


@pytest.mark.parametrize("seed", range(8))
def test_a_path_with_rate_limits_lasts_what_toppra_finds(make_rig, seed):
    rng = np.random.default_rng(seed)
    targets = np.concatenate((rng.uniform(0.02, 0.3, 5), [0.0]))
    track = [(1e-4 * n, float(target), "linear") for n, target in enumerate(targets)]
    tracks = tracks_of([[*track, (1e-4 * len(track), None, "end")]])
    rig = make_rig(1, fill=FILL, exhaust=EXHAUST)
    theirs = [fastest_by_toppra(curve) for curve in tracks.curve[:-1]]
    for keep in ("clock", "rhythm"):
        found = retime(tracks, abilities_of(rig), rig, np.empty(0), keep).tracks
        assert found.time_s[-1] == pytest.approx(sum(theirs), rel=1e-3)
        assert np.diff(found.time_s) == pytest.approx(theirs, rel=1e-3)
