"""Retiming again after an edit, at a cost of the change: for an editor, at every keystroke."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.retime.retiming import Retiming, retime
from composer.rig.model import Rig
from composer.tracks import Tracks

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Choices:
    """What a retiming is asked for beside the tracks, as `retime` takes it."""

    pins_s: Array
    keep: str = "clock"
    shrink: bool = False
    give_s: Array | None = None
    firm: Array | None = None
    rhythm: Flags | None = None


@dataclass(frozen=True, slots=True, eq=False)
class Retimer:
    """A retiming that can be asked for again with changed tracks. It costs and moves what a retiming from nothing does."""

    abilities: Abilities
    rig: Rig
    choices: Choices
    retiming: Retiming

    @staticmethod
    def of(tracks: Tracks, abilities: Abilities, rig: Rig, choices: Choices) -> "Retimer":
        """The first retiming of a score. Raises Unsolved as `retime` does."""
        return Retimer(abilities, rig, choices, _retimed(tracks, abilities, rig, choices, None))

    def edited(self, tracks: Tracks, choices: Choices | None = None) -> "Retimer":
        """The retiming of the score as it is now, by the same rig; choices where they changed too (they speak of segments)."""
        now = self.choices if choices is None else choices
        return replace(self, choices=now, retiming=_retimed(tracks, self.abilities, self.rig, now, self.retiming))


def _retimed(tracks: Tracks, abilities: Abilities, rig: Rig, choices: Choices, after: Retiming | None) -> Retiming:
    return retime(
        tracks, abilities, rig, choices.pins_s, choices.keep, choices.shrink, give_s=choices.give_s, firm=choices.firm,
        rhythm=choices.rhythm, after=after,
    )  # fmt: skip
