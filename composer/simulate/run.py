"""A whole score on the simulated rig, a block of ticks at a time, so that its length costs no memory."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.drive.inverse import LOOK_S, Inverse
from composer.limits.abilities import Abilities
from composer.limits.coil import coils_of
from composer.motion import Motion, motion_of, on_grid, strain_in
from composer.rig.model import Rig
from composer.simulate.duty import beyond_after, share_used
from composer.simulate.rig import SimulatedRig
from composer.tracks import SAME_INSTANT_S, Tracks

Array = NDArray[np.float64]

DEFAULT_HZ = 200.0
BLOCK = 1 << 17
"""Values of one kind in a block."""

LONGEST_TAIL_S = 10.0


@dataclass(frozen=True, slots=True, eq=False)
class Block:
    """B ticks on end: `time_s` (B,), `target` and `strain` (F, B), `pressure_kPa` (F, B) gauge, `supply_kPa` (B,) gauge.

    duty: (B,) the greatest share of its coil's allowance that any valve has in use
    drawn_L: free air drawn by all fibers up to the block's end, in L
    """

    time_s: Array
    target: Array
    strain: Array
    pressure_kPa: Array
    supply_kPa: Array
    duty: Array
    drawn_L: float


def blocks(
    tracks: Tracks,
    rig: Rig,
    abilities: Abilities,
    rate_Hz: float = DEFAULT_HZ,
    inverse: bool = True,
    real: tuple[Rig, Abilities] | None = None,
    values: int = BLOCK,
) -> Iterator[Block]:
    """Play tracks on a simulated rig at `rate_Hz` and yield what happens at every tick from 0 s on, in order.

    It goes on past the score's end for as long as the slowest fiber takes for a stroke, so that late arrivals are seen.
    Commands are sent as a player sends them: ahead of the score by the lead of the slowest to respond, each asking for the
    strain wanted at the end of its tick. `inverse` false sends everything without lead. `real`: the rig that is simulated,
    where it is not the one that the sender believes in. values: of one kind in a block.
    """
    tick = 1.0 / rate_Hz
    motion = motion_of(tracks, abilities)
    sender = Inverse(rig, abilities, inverse)
    lead = sender.lead_s
    simulated = SimulatedRig(*(real or (rig, abilities)))
    longest = float(lead.max(initial=0.0))
    early = int(np.ceil(longest / tick - SAME_INSTANT_S))
    # Commands are due `longest` ahead of the ticks, which are `early` whole ticks less this part of one: none where the
    # rig takes the mean over a step anyway, which may as well be a whole tick then.
    longest = early * tick if simulated.averages else longest
    part = early * tick - longest
    part = part if part > SAME_INSTANT_S else 0.0
    last = int(np.ceil((tracks.duration_s + tail_s(abilities)) * rate_Hz - 1e-6))
    coils = coils_of(rig)
    beyond = np.zeros(tracks.fibers)
    rest = np.zeros(tracks.fibers)
    before = rest
    size = max(1, values // max(1, tracks.fibers))
    for begin in range(-early, last + 1, size):
        ticks = np.arange(begin, min(begin + size, last + 1))
        sent = _sent(motion, sender, ticks + early, tick, lead - longest)
        time = ticks * tick
        strain, pressure = np.empty((tracks.fibers, len(ticks))), np.empty((tracks.fibers, len(ticks)))
        supply, duty = np.empty(len(ticks)), np.empty(len(ticks))
        for column in range(len(ticks)):
            # The state at the tick itself, then the way to the next.
            was = simulated.strain
            strain[:, column], pressure[:, column] = was, simulated.pressure_kPa
            supply[column], duty[column] = simulated.supply_kPa, share_used(coils, beyond).max(initial=0.0)
            now = sent[:, column] if ticks[column] + early >= 0 else rest
            if part:
                simulated.step(part, before)
            simulated.step(tick - part, now)
            before = now
            beyond = beyond_after(coils, beyond, was, simulated.strain, tick)
        shown = ticks >= 0
        if shown.any():
            target = on_grid(motion, time[shown], strain_in)
            yield Block(
                time[shown], target, strain[:, shown], pressure[:, shown], supply[shown], duty[shown], simulated.drawn_L
            )


def tail_s(abilities: Abilities) -> float:
    """Seconds for which a run goes on after the score's end: the longest stroke of any fiber, within reason."""
    slowest = np.minimum(abilities.fill, abilities.exhaust).min(axis=1)[abilities.which]
    return float(min((abilities.stroke / slowest).max(initial=0.0), LONGEST_TAIL_S))


def _sent(motion: Motion, sender: Inverse, number: NDArray[np.int64], tick: float, behind: Array) -> Array:
    """Commands (F, B) of such numbers: number m is in force from m ticks on, for fibers that respond `behind` that."""
    ends = (number + 1) * tick + behind[:, None]
    wanted = on_grid(motion, ends, strain_in)
    soon = on_grid(motion, ends + sender.soon_s[:, None], strain_in) if sender.soon_s.any() else wanted
    ahead = on_grid(motion, ends + LOOK_S, strain_in)
    return sender.commands(wanted, soon, ahead, tick)
