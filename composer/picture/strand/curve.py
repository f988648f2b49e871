"""One fiber over time as data: its strain in real units, how far and how fast it can go, what it needs against what it has."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits import tables
from composer.limits.abilities import Abilities
from composer.limits.snag import Snag
from composer.picture.units import unit_of
from composer.report.sentences import two
from composer.tracks import HOLD, Tracks, durations, end_strain

Array = NDArray[np.float64]
Index = NDArray[np.int64]

WAYS = 33
"""Points of the fastest way from a knot."""


@dataclass(frozen=True, slots=True, eq=False)
class Knots:
    """The ends of a fiber's moves, (N,) each: the segment (index into the tracks) that ends there, when, in s, at which strain.

    from_s, from_strain: where the segment begins
    """

    segment: Index
    at_s: Array
    strain: Array
    from_s: Array
    from_strain: Array


def knots_of(tracks: Tracks, fiber: int) -> Knots:
    """The knots of one fiber, in order of time."""
    mine = np.arange(tracks.first[fiber], tracks.first[fiber + 1])
    segment = mine[tracks.manner[mine] != HOLD]
    begins = tracks.time_s[segment]
    return Knots(segment, begins + durations(tracks)[segment], end_strain(tracks)[segment], begins, tracks.curve[segment, 0])


def reach(abilities: Abilities, fiber: int, knots: Knots, which: Index) -> list[tuple[Array, Array, Array]]:
    """From where each of these moves begins, how far the fiber can get by its end: instants, lowest and highest strain.

    Where a move leaves from outside the fiber's stroke, as far as from the stroke's end.
    """
    if not len(which):
        return []
    # Closer together at the beginning, where the way bends most.
    share = np.linspace(0.0, 1.0, WAYS) ** 2
    elapsed = (knots.at_s - knots.from_s)[which, None] * share
    stroke = float(abilities.stroke[fiber])
    start = np.broadcast_to(np.clip(knots.from_strain[which], 0.0, stroke)[:, None], elapsed.shape)
    low, high = (
        tables.strain_after(abilities, fiber, start.ravel(), np.full(start.size, goal), elapsed.ravel()).reshape(elapsed.shape)
        for goal in (0.0, stroke)
    )
    return [(knots.from_s[k] + elapsed[n], low[n], high[n]) for n, k in enumerate(which)]


def needs_and_has(snag: Snag, abilities: Abilities, fiber: int) -> str:
    """What a snag needs and what there is, in the fiber's own units: "needs 240 mm/s, can do 180 mm/s"."""
    per_strain, unit = unit_of(abilities, fiber)
    scale, said, has = {
        "rate": (per_strain, f"{unit}/s", "can do"),
        "accel": (per_strain, f"{unit}/s²", "can do"),
        "stroke": (per_strain, unit, "can do"),
        "switching": (1.0, "switches a second", "its valve bears"),
        "duty": (1.0, "s of its coil", "it bears"),
        "hold": (1.0, "s held", "it may hold"),
        "air": (1.0, "L of air", "there are"),
        "pin": (1.0, "s before the pin", "there are"),
    }[snag.kind]
    needs, there = _rounded(abs(snag.needs) * scale, abs(snag.has) * scale)
    if snag.kind == "stroke" and snag.needs < 0.0:
        return f"goes {needs} {unit} below rest"
    return f"needs {needs} {said}, {has} {there}"


def _rounded(needs: float, has: float) -> tuple[str, str]:
    """Two numbers in as few digits as people want of them, and as many as it takes to tell them apart."""
    for digits in (0, 1):
        said = (f"{needs:.{digits}f}", f"{has:.{digits}f}")
        if has >= 10.0 ** (2 - digits) and said[0] != said[1]:
            return said
    return two(needs, has)


def worded(snags: Sequence[Snag], abilities: Abilities, fiber: int) -> list[tuple[float, float, str]]:
    """The snags of one fiber as a strand shows them: from, to in s, and what it needs against what it has."""
    return [(snag.from_s, snag.to_s, needs_and_has(snag, abilities, fiber)) for snag in snags if snag.fiber == fiber]
