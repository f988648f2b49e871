"""The governor of a rig: its limits, made ready for ticks."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.air import refill_L_s, store_L
from composer.limits.coil import coils_of
from composer.limits.duration import RESOLUTION
from composer.limits.live import Live, live, look
from composer.rig.model import Rig

Array = NDArray[np.float64]
Index = NDArray[np.int64]

LONGEST_TICK_S = 0.010
"""Ticks may be as long as this unless the governor is made for longer ones."""

LOW = 0.5 * (1.0 - 1e-4)
"""Share of stroke at or below which a hold is over at once: so far below half that the check sees two holds as two. Between
here and half it is over when the fiber has been there for a tick."""

LET_DOWN_TO = 0.45
"""Share of stroke to which a fiber is let down whose hold has lasted as long as it may."""

ROUNDING = 1e-7
"""Relative: a coil has been on long enough when it lacks so little; the check forgives ten times as much."""

RECOVERED = 0.1
"""A coil that has had to stop fills again when so much of its burst is free, so that it does not chatter at its limit."""


@dataclass(frozen=True, slots=True, eq=False)
class Governor:
    """What the governor of F fibers knows that never changes.

    live: the rates, air and ways back
    braced: (B,) fibers with a limit of acceleration, a slice if all have one; accel: (F,) that limit, 1/s²,
        and half_per_accel half of one over it, 0 for no limit
    stroke, least, half, low, let_down_to: (F,) strains: usable stroke, one step of the drive, the rest as above
    over_s: (F,) seconds above half stroke and on the whole way back to rest from which on a hold is too long, inf for no limit
    duty, off_duty, burst_s, min_on_s, holding: (F,) of each coil: share of time that it may be on, and the rest of it, seconds
        beyond it, how long it stays on once it is, and whether holding energises it; sure_on_s: min_on_s but for rounding
    late_s, spare_s: (F,) seconds that a way down may take beyond what its rates say, for ticks that begin late and the brakes,
        and the same for the way to rest, whose last step waits until the coil may be switched off
    store_L, refill_L_s: the supply
    spare_on_s, recovered_s: (F,) seconds of its burst that a coil must have left to be switched on, and to fill once tired
    has_braced, all_braced, has_duty, has_hold, has_holding: whether any fiber has such a limit
    """

    live: Live
    braced: Index | slice
    accel: Array
    half_per_accel: Array
    stroke: Array
    least: Array
    half: Array
    low: Array
    let_down_to: Array
    over_s: Array
    duty: Array
    off_duty: Array
    burst_s: Array
    min_on_s: Array
    sure_on_s: Array
    holding: NDArray[np.bool_]
    late_s: Array
    spare_s: Array
    store_L: float
    refill_L_s: float
    spare_on_s: Array
    recovered_s: Array
    has_braced: bool
    all_braced: bool
    has_duty: bool
    has_hold: bool
    has_holding: bool

    @property
    def fibers(self) -> int:
        """How many fibers."""
        return len(self.stroke)


def governor_of(rig: Rig, abilities: Abilities, longest_tick_s: float = LONGEST_TICK_S) -> Governor:
    """The governor of a rig for ticks of at most `longest_tick_s`; the shorter they may be the closer it goes to the limits."""
    tables = live(abilities, longest_tick_s)
    coils = coils_of(rig)
    stroke = abilities.stroke
    braced = np.flatnonzero(np.isfinite(abilities.accel))
    least = stroke * RESOLUTION
    at_least, at_half = look(tables, least), look(tables, 0.5 * stroke)
    # To gather speed and to brake again cost a braced fiber half of rate / accel each, and its ticks begin late four times:
    # to stop, to turn, to brake, to stand. Another fiber loses what is left of its last tick.
    late = np.full(len(stroke), longest_tick_s)
    late[braced] += 3.0 * longest_tick_s + at_least.exhaust[braced] / abilities.accel[braced]
    return Governor(
        live=tables,
        braced=slice(None) if len(braced) == len(stroke) else braced,
        accel=abilities.accel,
        half_per_accel=0.5 / abilities.accel,
        stroke=stroke,
        least=least,
        half=0.5 * stroke,
        low=LOW * stroke,
        let_down_to=LET_DOWN_TO * stroke,
        over_s=abilities.max_hold_s - late + at_half.back,
        duty=coils.duty,
        off_duty=1.0 - coils.duty,
        burst_s=coils.burst_s,
        min_on_s=1.0 / coils.switch_Hz,
        sure_on_s=(1.0 - ROUNDING) / coils.switch_Hz,
        holding=coils.holding,
        late_s=late,
        spare_s=late + at_least.back,
        store_L=store_L(rig.supply),
        refill_L_s=refill_L_s(rig.supply),
        spare_on_s=(1.0 - coils.duty) / coils.switch_Hz,
        recovered_s=RECOVERED * coils.burst_s + (1.0 - coils.duty) / coils.switch_Hz,
        has_braced=len(braced) > 0,
        all_braced=0 < len(braced) == len(stroke),
        has_duty=bool(np.any(coils.duty < 1.0)),
        has_hold=bool(np.any(np.isfinite(abilities.max_hold_s))),
        has_holding=bool(np.any(coils.holding)),
    )
