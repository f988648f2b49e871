"""Tracks and abilities made by hand, for the tests of the limits."""

from collections.abc import Callable, Sequence

import numpy as np
import pytest

from composer.fiber.capability import Capability
from composer.limits.abilities import Abilities
from composer.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, STEP, SUDDEN, Tracks


@pytest.fixture(scope="session")
def make_tracks() -> Callable[..., Tracks]:
    """A maker of tracks: for each fiber a list of (seconds, target, shape) or (seconds, curve of six numbers).

    A target equal to the present strain with shape "hold" is a hold. Line n of the score made segment n of each fiber.
    """

    def make(*fibers: Sequence[tuple], duration_s: float | None = None, line: int = 10) -> Tracks:
        first, time, curve, manner, shape, lines = [0], [], [], [], [], []
        for moves in fibers:
            now, at = 0.0, 0.0
            for number, move in enumerate([*moves, (0.0, None, "hold")]):
                row, kind, named = np.zeros(6), HOLD, -1
                if len(move) == 2:
                    row, kind = np.array(move[1], dtype=float), MOVE
                elif move[2] == "hold":
                    row[0] = at
                else:
                    row = PROGRESS[move[2]] * (move[1] - at)
                    row[0] += at
                    kind = {"sudden": SUDDEN, "step": STEP}.get(move[2], MOVE)
                    named = NAMES.index(move[2])
                time.append(now)
                curve.append(row)
                manner.append(kind)
                shape.append(named)
                lines.append(0 if kind == HOLD else line + number)
                now, at = now + move[0], row.sum()
            first.append(len(time))
        time = np.array(time)
        return Tracks(
            first=np.array(first),
            time_s=time,
            curve=np.array(curve),
            manner=np.array(manner, dtype=np.int8),
            shape=np.array(shape, dtype=np.int8),
            line=np.array(lines, dtype=np.int32),
            phrase_line=np.zeros(len(time), dtype=np.int32),
            duration_s=float(time.max()) if duration_s is None else duration_s,
        )

    return make


@pytest.fixture(scope="session")
def make_abilities() -> Callable[..., Abilities]:
    """A maker of abilities: for each fiber (strains, fill rates, exhaust rates), all of one length; options for all."""

    def make(*tables: tuple, accel: float = np.inf, max_hold_s: float = np.inf, air_L=None) -> Abilities:
        strain, fill, exhaust = (np.array([t[n] for t in tables], dtype=float) for n in range(3))
        ones = np.ones(len(tables))
        air = strain * 0.01 if air_L is None else np.array(air_L, dtype=float)
        capabilities = tuple(
            Capability(s[-1], "contract", 400.0, None, s, f, e, accel, a, None)
            for s, f, e, a in zip(strain, fill, exhaust, air, strict=True)
        )
        return Abilities(
            capabilities=capabilities,
            which=np.arange(len(tables)),
            stroke=strain[:, -1],
            accel=accel * ones,
            length_mm=400.0 * ones,
            turn_deg=np.nan * ones,
            max_hold_s=max_hold_s * ones,
            strain=strain,
            fill=fill,
            exhaust=exhaust,
            air_L=air,
        )

    return make
