"""From the strain wanted to what a valve driver is sent, and how far ahead it must be sent to land on the count.

Drive units: `pressure` and `strain` drives take a set-point, 0 to 1 (full pressure, usable stroke); `valve` drives a signed
opening, 1 filling fully open, -1 exhausting fully open, 0 shut. A further kind of fiber is one row of `SENT`.
"""

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.limits import tables
from composer.limits.abilities import Abilities
from composer.rig.model import Rig

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def commands(rig: Rig, abilities: Abilities, wanted_strain: ArrayLike, wanted_rate: ArrayLike) -> Array:
    """What to send, in drive units, so that fibers have these strains (1) and rates (1/s); both (F,) or (F, T).

    Clipped to what a drive can take. Where the opening of a valve is sent over a tick, let `wanted_rate` be the mean over
    that tick, (strain at its end - strain at its start) / tick, so that nothing adds up from tick to tick.
    """
    strain, rate = np.asarray(wanted_strain, dtype=float), np.asarray(wanted_rate, dtype=float)
    sent = np.empty(np.broadcast_shapes(strain.shape, rate.shape))
    strain, rate = np.broadcast_to(strain, sent.shape), np.broadcast_to(rate, sent.shape)
    for kind, members in members_by_kind(rig).items():
        sent[members] = SENT[kind](rig, abilities, members, strain[members], rate[members])
    return sent


def lead_s(rig: Rig, abilities: Abilities, on: bool = True) -> Array:
    """Seconds (F,) by which each fiber's commands must run ahead of the score; all 0 where `on` is false.

    For a rated fiber the response time of its valve: its rates are what a bench saw of valve, tube and fiber together.
    """
    lead = np.zeros(len(rig.fibers))
    if on:
        for kind, members in members_by_kind(rig).items():
            lead[members] = LEADS[kind](rig, abilities, members)
    return lead


def is_valve_drive(rig: Rig) -> NDArray[np.bool_]:
    """(F,) which fibers' drivers take a signed opening in place of a set-point."""
    return np.array([fiber.mounting.valve.drive == "valve" for fiber in rig.fibers], dtype=bool)


def vented(rig: Rig) -> Array:
    """The command (F,) that lets every fiber's air out as fast as it goes."""
    return np.where(is_valve_drive(rig), -1.0, 0.0)


def members_by_kind(rig: Rig) -> dict[str, Index]:
    """The indices of the fibers of each kind that the rig has."""
    kinds = np.array([fiber.type.kind for fiber in rig.fibers], dtype=object)
    return {kind: np.flatnonzero(kinds == kind) for kind in dict.fromkeys(kinds)}


def _rated_sent(rig: Rig, abilities: Abilities, members: Index, strain: Array, rate: Array) -> Array:
    """A rated fiber: the strain as a share of its stroke, or the rate as a share of the fastest in its direction."""
    beside = (slice(None),) + (None,) * (strain.ndim - 1)
    share = np.clip(strain / abilities.stroke[members][beside], 0.0, 1.0)
    by_valve = is_valve_drive(rig)[members]
    if by_valve.any():
        fiber = np.broadcast_to(members[beside], strain.shape)
        opening = np.clip(rate / tables.rates(abilities, fiber, strain, rate > 0.0), -1.0, 1.0)
        share = np.where(by_valve[beside], opening, share)
    return share


def _rated_lead(rig: Rig, abilities: Abilities, members: Index) -> Array:
    return np.array([rig.fibers[member].mounting.valve.switch_ms * 1e-3 for member in members])


SENT: dict[str, Callable[[Rig, Abilities, Index, Array, Array], Array]] = {"rated": _rated_sent}
"""What is sent to each kind of fiber."""

LEADS: dict[str, Callable[[Rig, Abilities, Index], Array]] = {"rated": _rated_lead}
"""How far ahead each kind of fiber must be sent to."""
