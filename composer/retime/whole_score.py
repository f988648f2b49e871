"""A score retimed with all that it says itself: its pins and their give, what its parts keep, and how firmly they stand."""

from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.retime.choices import choices_of
from composer.retime.retiming import Retiming, retime
from composer.rig.model import Rig
from composer.score.model import Score
from composer.tracks import Tracks


class Made(Protocol):
    """A score with what was made of it; pins_s: (P,) instants that must not move, pins_give_s: (P,) s each may after all."""

    @property
    def score(self) -> Score:
        """As read."""

    @property
    def tracks(self) -> Tracks:
        """As expanded."""

    @property
    def abilities(self) -> Abilities:
        """Of its rig."""

    @property
    def rig(self) -> Rig:
        """The one it names."""

    @property
    def pins_s(self) -> NDArray[np.float64]:
        """In s."""

    @property
    def pins_give_s(self) -> NDArray[np.float64]:
        """In s."""


def keep_of(score: Score, keep: str | None = None) -> str:
    """What is kept where a section does not say: what is asked for, else what the score says, else the clock."""
    return keep or score.keep or "clock"


def retime_score(made: Made, keep: str | None = None, **asked: Any) -> Retiming:
    """The least change of a score's times, as `retiming.retime`, which is handed what else is asked. Raises Unsolved."""
    keep = keep_of(made.score, keep)
    firm, rhythm = choices_of(made.score, made.tracks, keep)
    return retime(
        made.tracks, made.abilities, made.rig, made.pins_s, keep, give_s=made.pins_give_s, firm=firm, rhythm=rhythm, **asked
    )
