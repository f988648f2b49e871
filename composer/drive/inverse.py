"""From the strain wanted to what a valve driver is sent, and how far ahead it must be sent to land on the count.

Drive units: `pressure` and `strain` drives take a set-point, 0 to 1 (full pressure, usable stroke); `valve` drives a signed
opening, 1 filling fully open, -1 exhausting fully open, 0 shut.
"""

import numpy as np
from numpy.typing import NDArray

from composer.drive.modelled import ModelledInverse, modelled_inverse
from composer.drive.rated import RatedInverse
from composer.limits.abilities import Abilities
from composer.rig.model import Rig

Array = NDArray[np.float64]

LOOK_S = 0.25
"""How long before a move its fiber is made ready for it, in s: how far ahead the inverse wants to know the score."""


FOREVER_S = 1e6
"""A tick so long that nothing in it depends on how fast a fiber goes."""


class Inverse:
    """What to send, tick after tick, so that a rig's fibers have the strains wanted; it remembers where friction holds them.

    lead_s: (F,) seconds by which each fiber's commands must run ahead of the score; soon_s: (F,) the lag of each fiber, so
    far ahead it wants to know the score at least. With `on` false nothing leads and friction is left out, which shows
    what the inverse buys.
    """

    def __init__(self, rig: Rig, abilities: Abilities, on: bool = True):
        physics = [abilities.capabilities[which].physics for which in abilities.which]
        by_valve = is_valve_drive(rig)
        # Water answers at once to its valve: what is known of its rates is all there is to invert.
        by_rates = np.array(
            [each is None or (each.water and valve) for each, valve in zip(physics, by_valve, strict=True)], bool
        )
        plain, modelled = np.flatnonzero(by_rates), np.flatnonzero(~by_rates)
        self._laws: list[tuple[NDArray[np.int64], RatedInverse | ModelledInverse]] = []
        if plain.size:
            self._laws.append((plain, RatedInverse(abilities, plain, by_valve[plain])))
        if modelled.size:
            self._laws.append((modelled, modelled_inverse(rig, abilities, modelled, on)))
        tube = np.array([0.0 if each is None else each.path.delay for each in physics])
        switch = np.array([fiber.mounting.valve.switch_ms * 1e-3 for fiber in rig.fibers])
        # A rating says what valve, tube and fiber do together; a modelled fiber's tube comes on top of its valve.
        self.lead_s = (switch + tube) * on
        self.soon_s = np.array([0.0 if each is None else each.settle for each in physics])
        self.reset()

    def reset(self, strain: Array | None = None) -> None:
        """Begin again, all fibers at rest and vented, or standing at `strain` (F,)."""
        begin = np.zeros(len(self.lead_s)) if strain is None else strain
        self._told = [law.at(begin[members]) for members, law in self._laws]

    def commands(self, strain: Array, soon: Array, ahead: Array, tick_s: float) -> Array:
        """What to send (F, T), in drive units, over ticks that are to end at `strain` (F, T); each call goes on from the last.

        soon: (F, T) strain wanted `soon_s` later, ahead: (F, T) LOOK_S later, both `strain` where nobody knows; clipped to
        what a drive can take.
        """
        sent = np.empty(strain.shape)
        for number, (members, law) in enumerate(self._laws):
            part = (strain[members], soon[members], ahead[members])
            sent[members], self._told[number] = law.commands(self._told[number], *part, tick_s)
        return sent


def is_valve_drive(rig: Rig) -> NDArray[np.bool_]:
    """(F,) which fibers' drivers take a signed opening in place of a set-point."""
    return np.array([fiber.mounting.valve.drive == "valve" for fiber in rig.fibers], dtype=bool)


def standing(rig: Rig, abilities: Abilities, points: int) -> Array:
    """Set-points (F, points) at which fibers stand at even shares of their stroke, from rest to full, coming from below; what a
    valve drive takes says nothing of where it stands, and is as it comes."""
    strain = np.outer(abilities.stroke, np.linspace(0.0, 1.0, points))
    return Inverse(rig, abilities).commands(strain, strain, strain, FOREVER_S)


def vented(rig: Rig) -> Array:
    """The command (F,) that lets every fiber's air out as fast as it goes."""
    return np.where(is_valve_drive(rig), -1.0, 0.0)
