"""Small scores made at random, as tracks, for the tests of this room."""

from dataclasses import dataclass

import numpy as np

from composer.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, STEP, SUDDEN, Tracks

SHAPES = ("smooth", "linear", "swell", "settle")


def tracks_of(fibers: list[list[tuple]], duration_s: float | None = None) -> Tracks:
    """Tracks from lists of (start second, target strain, shape), one list a fiber; shape "hold" keeps the value.

    Each segment lasts to the next one's start; a last entry (second, None, "end") closes the fiber with a hold without end.
    """
    first, times, curves, manners, shapes, lines = [0], [], [], [], [], []
    line = 1
    for fiber in fibers:
        value = 0.0
        for second, target, shape in fiber:
            times.append(second)
            lines.append(line)
            line += 1
            curve = np.zeros(6)
            if shape in ("hold", "end"):
                manners.append(HOLD)
                shapes.append(-1)
            else:
                curve += (target - value) * PROGRESS[shape]
                manners.append({"sudden": SUDDEN, "step": STEP}.get(shape, MOVE))
                shapes.append(NAMES.index(shape))
            curve[0] += value
            value = value if target is None else target
            curves.append(curve)
        first.append(len(times))
    count = len(times)
    return Tracks(
        first=np.array(first),
        time_s=np.array(times, dtype=float),
        curve=np.array(curves).reshape(count, 6),
        manner=np.array(manners, dtype=np.int8),
        shape=np.array(shapes, dtype=np.int8),
        line=np.array(lines, dtype=np.int32),
        phrase_line=np.zeros(count, dtype=np.int32),
        duration_s=max(times) if duration_s is None else duration_s,
    )


@dataclass(frozen=True)
class Made:
    tracks: Tracks
    pins_s: np.ndarray


def random_score(seed: int, fibers: int = 4, moves: int = 6, stroke: float = 0.3, fill: float = 0.6, exhaust: float = 0.3,
                 pins: bool = True, sudden: bool = True, grid_s: float = 0.25) -> Made:  # fmt: skip
    """Moves on a common grid, so that many land together, some too fast; holds between some; rest at the end."""
    rng = np.random.default_rng(seed)
    made, latest = [], 0.0
    for _ in range(fibers):
        value, at, one = 0.0, 0.0, []
        for _ in range(int(rng.integers(1, moves + 1))):
            target = float(np.round(rng.uniform(0.0, stroke), 3))
            if abs(target - value) < 0.01:
                target = stroke - value if value < stroke / 2 else 0.0
            shape = str(rng.choice(SHAPES))
            takes = max(grid_s, np.round(rng.uniform(0.4, 3.0) * 1.875 * abs(target - value) / exhaust / grid_s) * grid_s)
            if sudden and rng.random() < 0.15:
                takes = abs(target - value) / (fill if target > value else exhaust)
                arrives = np.ceil((at + takes * rng.uniform(0.6, 2.5)) / grid_s) * grid_s
                if arrives - takes > at + 1e-6:
                    one.append((at, None, "hold"))
                    at = arrives - takes
                one.append((at, target, "sudden"))
                at, value = arrives, target
                continue
            if rng.random() < 0.5:
                one.append((at, None, "hold"))
                at += float(rng.integers(1, 5)) * grid_s
            one.append((at, target, shape))
            at, value = at + takes, target
        takes = np.ceil(2.5 * value / exhaust / grid_s) * grid_s
        one += [(at, 0.0, "smooth"), (at + takes, None, "end")]
        at += takes
        made.append(one)
        latest = max(latest, at)
    instants = rng.uniform(0.0, latest, int(rng.integers(1, 3))) if pins and rng.random() < 0.6 else np.empty(0)
    return Made(tracks_of(made), np.round(instants / grid_s) * grid_s)
