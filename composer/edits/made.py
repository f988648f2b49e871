"""What is known of a text that can be read: the last good state, against which a half-typed text is explained."""

from collections.abc import Callable, Sequence
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.score.flat import CuePlace
from composer.score.model import Score
from composer.score.tempo import TempoMap
from composer.tracks import Tracks

Array = NDArray[np.float64]


class Made(Protocol):
    """A score with all that follows from it and its rig; `composer.load.Loaded` is one. Attributes as there."""

    @property
    def score(self) -> Score:
        """As read."""

    @property
    def rig(self) -> Rig:
        """The rig."""

    @property
    def abilities(self) -> Abilities:
        """What its fibers can do."""

    @property
    def tempo(self) -> TempoMap:
        """Counts, seconds and bars."""

    @property
    def tracks(self) -> Tracks:
        """The score expanded."""

    @property
    def pins_s(self) -> Array:
        """(P,) instants that must not move."""

    @property
    def pins_give_s(self) -> Array:
        """(P,) how far each may after all."""

    @property
    def cues(self) -> Sequence[CuePlace]:
        """In order of time."""


Remake = Callable[[str], Made]
"""From a text to what follows from it, by the rig at hand; raises Faults. `composer.load.made_from` of a score that was read
makes one: `lambda text: made_from(read_score(text, file, read_used), rig)`."""
