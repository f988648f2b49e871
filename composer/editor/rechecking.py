"""The check of a score again after an edit: all limits but air know fibers apart, so only those that changed are checked.

What is found is what `composer.limits.check` finds from nothing. It comes in steps, so that a worker can turn to a newer text.
"""

from collections.abc import Generator
from dataclasses import dataclass, replace
from hashlib import blake2b

import numpy as np
from numpy.typing import NDArray

from composer.limits import air, duty
from composer.limits.abilities import Abilities
from composer.limits.check import Check
from composer.limits.snag import Snag
from composer.limits.stretches import line_of
from composer.limits.table import LIMITS
from composer.quivers import Quivers
from composer.rig.model import Rig
from composer.tracks import HOLD, Tracks

STEP_KNOTS = 1000
"""Knots that are checked between one look for a newer text and the next."""


@dataclass(frozen=True, slots=True, eq=False)
class Known:
    """Fibers as they were checked: what each was, its snags with segments counted from its own first; the air they draw."""

    rig: Rig
    what: tuple[bytes, ...]
    snags: tuple[tuple[Snag, ...], ...]
    asked: air.Demand


def recheck(tracks: Tracks, rig: Rig, abilities: Abilities, known: Known | None) -> Generator[None, None, tuple[Check, Known]]:
    """The check, in steps; returns it with what is known then. `known` is from a check by the same rig, or of no use."""
    what = _what(tracks)
    before = known if known is not None and known.rig is rig and len(known.what) == len(what) else None
    snags: list[tuple[Snag, ...]] = [()] * tracks.fibers
    anew = []
    for fiber, mark in enumerate(what):
        if before is not None and before.what[fiber] == mark:
            snags[fiber] = before.snags[fiber]
        else:
            anew.append(fiber)
    for some in _steps(anew, np.diff(tracks.first)):
        part = _alone(tracks, some)
        found: dict[int, list[Snag]] = {fiber: [] for fiber in some}
        for limit in LIMITS:
            if limit is not air.LIMIT:
                for snag in limit.snags(part, rig, abilities):
                    own = snag.knot - int(part.first[snag.fiber]) if snag.knot >= 0 else -1
                    found[snag.fiber].append(replace(snag, knot=own, line=0))
        for fiber in some:
            snags[fiber] = tuple(found[fiber])
        yield
    used = air.use(tracks, rig.supply, abilities)
    whole = air.snags_of(used, tracks, abilities)
    for fiber, own in enumerate(snags):
        first = int(tracks.first[fiber])
        for snag in own:
            knot = snag.knot + first if snag.knot >= 0 else -1
            whole.append(replace(snag, knot=knot, line=line_of(tracks, knot) if knot >= 0 else 0))
    whole.sort(key=lambda snag: (snag.from_s, snag.to_s, -1 if snag.fiber is None else snag.fiber, snag.kind))
    shares = duty.shares(tracks, rig, abilities)
    highest = int(shares.argmax()) if len(shares) else None
    check = Check(tuple(whole), used.lowest_kPa, used.used_L, float(shares[highest]) if highest is not None else 0.0, highest)
    return check, Known(rig, what, tuple(snags), used.asked)


def _steps(fibers: list[int], knots: NDArray[np.int64]) -> list[list[int]]:
    """Fibers in lots of so many knots."""
    lots: list[list[int]] = []
    count = STEP_KNOTS
    for fiber in fibers:
        if count >= STEP_KNOTS:
            lots.append([])
            count = 0
        lots[-1].append(fiber)
        count += int(knots[fiber])
    return lots


def _alone(tracks: Tracks, fibers: list[int]) -> Tracks:
    """Tracks in which these fibers do what they do, and all others nothing."""
    keep = np.zeros(tracks.fibers, dtype=bool)
    keep[fibers] = True
    counts = np.where(keep, np.diff(tracks.first), 1)
    first = np.concatenate([[0], np.cumsum(counts)])
    pick = np.repeat(tracks.first[:-1] - first[:-1], counts) + np.arange(first[-1])
    time, curve = tracks.time_s[pick].copy(), tracks.curve[pick].copy()
    manner = tracks.manner[pick].copy()
    idle = first[:-1][~keep]
    time[idle], curve[idle], manner[idle] = 0.0, 0.0, HOLD
    quivers = tracks.quivers
    if len(quivers):
        owner = np.searchsorted(tracks.first, quivers.knot, side="right") - 1
        mine = keep[owner]
        shift = (first[:-1] - tracks.first[:-1])[owner[mine]]
        quivers = Quivers(quivers.knot[mine] + shift, quivers.until[mine] + shift, quivers.hertz[mine], quivers.amplitude[mine])
    return Tracks(
        first, time, curve, manner, tracks.shape[pick], tracks.line[pick], tracks.phrase_line[pick], tracks.duration_s, quivers
    )


def _what(tracks: Tracks) -> tuple[bytes, ...]:
    """What each fiber is asked to do, wherever in the text it is written, as a digest."""
    quivers = tracks.quivers
    owner = np.searchsorted(tracks.first, quivers.knot, side="right") - 1
    by_fiber: dict[int, list[int]] = {}
    for number, fiber in enumerate(owner.tolist()):
        by_fiber.setdefault(fiber, []).append(number)
    length = np.float64(tracks.duration_s).tobytes()
    marks = []
    for fiber in range(tracks.fibers):
        here = slice(int(tracks.first[fiber]), int(tracks.first[fiber + 1]))
        digest = blake2b(length, digest_size=16)
        for array in (tracks.time_s, tracks.curve, tracks.manner, tracks.shape):
            digest.update(array[here].tobytes())
        for number in by_fiber.get(fiber, ()):
            spread = (quivers.knot[number] - here.start, quivers.until[number] - here.start)
            digest.update(np.array([*spread, quivers.hertz[number], quivers.amplitude[number]], dtype=float).tobytes())
        marks.append(digest.digest())
    return tuple(marks)
