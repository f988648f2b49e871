"""The check of a score: every stretch that a fiber or the supply cannot do, in order of time."""

from dataclasses import dataclass

from composer.limits import air, duty, switching
from composer.limits.abilities import Abilities
from composer.limits.coil import on_times
from composer.limits.snag import Snag
from composer.limits.table import LIMITS
from composer.rig.model import Rig
from composer.tracks import Tracks


@dataclass(frozen=True, slots=True)
class Check:
    """What a check found.

    snags: in order of time, one for each unbroken stretch of one kind on one fiber
    lowest_kPa: the lowest that the receiver falls, gauge (0: it would be empty); used_L: free air drawn by the whole score
    duty_highest: the greatest share of the score's length that any coil is energised; duty_fiber: whose, None for a rig
        without fibers
    """

    snags: tuple[Snag, ...]
    lowest_kPa: float
    used_L: float
    duty_highest: float
    duty_fiber: int | None

    @property
    def ok(self) -> bool:
        """Whether the rig can do the score as it stands."""
        return not self.snags


def check(tracks: Tracks, rig: Rig, abilities: Abilities) -> Check:
    """Check tracks against every limit of a rig, from scratch."""
    used, on = air.use(tracks, rig.supply, abilities), on_times(tracks, rig, abilities)
    # What several limits, or a limit and the report, go by is worked out once.
    known = {
        air.LIMIT.kind: lambda: air.snags_of(used, tracks, abilities),
        duty.LIMIT.kind: lambda: duty.snags_of(on, tracks, rig),
        switching.LIMIT.kind: lambda: switching.snags_of(on, tracks, rig),
    }
    snags: list[Snag] = []
    for limit in LIMITS:
        snags += known[limit.kind]() if limit.kind in known else limit.snags(tracks, rig, abilities)
    snags.sort(key=lambda snag: (snag.from_s, snag.to_s, -1 if snag.fiber is None else snag.fiber, snag.kind))
    shares = duty.shares_of(on, tracks)
    highest = int(shares.argmax()) if len(shares) else None
    return Check(
        snags=tuple(snags),
        lowest_kPa=used.lowest_kPa,
        used_L=used.used_L,
        duty_highest=float(shares[highest]) if highest is not None else 0.0,
        duty_fiber=highest,
    )
