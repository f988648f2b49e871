"""What the loop plays: something that moves on by ticks, and a command for all valves after each."""

from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from composer.drive.inverse import LOOK_S, Inverse
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from player.engine.set_down import SetDown
from player.engine.transport import Cue, Transport

Array = NDArray[np.float64]


class Source(Protocol):
    """A score under the operator's hand, or a recording.

    command: (F,) drive units for the tick that has just been taken; lead_s: seconds by which it must be in force earlier
    strain: (F,) wanted at the end of that tick, None where that is not known; resumes: whether it can begin again in its midst
    """

    command: Array
    strain: Array | None
    lead_s: float
    position_s: float
    duration_s: float
    phase: str
    waiting: Cue | None
    cue: Cue | None
    next_cue: Cue | None
    let_down: int
    resumes: bool

    def start(self, from_s: float = 0.0) -> None:
        """Begin from a place, fibers first brought to it."""

    def found(self, strain: Array) -> None:
        """Every fiber is at rest or vented, found at these strains (F,)."""

    def pause(self) -> None:
        """Stand and hold."""

    def go_on(self) -> None:
        """Go on from a stand."""

    def jump(self, to_s: float) -> None:
        """Go to another place."""

    def rest(self) -> None:
        """Bring all to rest."""

    def set_down(self, fiber: int) -> None:
        """Take one fiber out of the score, to rest and to stay there."""

    def tick(self, dt_s: float) -> str:
        """Let a tick pass: "wait", "end", "at_rest", or "" for nothing worth telling."""


class Lags:
    """Fibers whose valves answer sooner than the slowest are given where they were wanted that much ago, so all are together.

    lead_s: by how much all run ahead; each_s: (F,) by how much less each fiber must
    """

    def __init__(self, lead_s: Array, strain: Array):
        """lead_s: (F,) by how much each fiber's commands must run ahead; strain: (F,) where they begin."""
        self.lead_s = float(lead_s.max(initial=0.0))
        self.each_s = self.lead_s - lead_s
        self._any = bool(self.each_s.any())
        self._fibers = np.arange(len(lead_s))
        self._past = [strain]

    def behind(self, strain: Array, dt_s: float) -> Array:
        """Each fiber's strain (F,) as it was its lag ago, in a straight line between the ends of ticks."""
        if not self._any:
            return strain
        ticks = self.each_s / dt_s
        whole = np.floor(ticks + 1e-9).astype(np.int64)
        part = np.maximum(ticks - whole, 0.0)
        keep = int(whole.max()) + 2
        self._past = [strain, *self._past[: keep - 1]]
        past = np.array(self._past)
        last = len(past) - 1
        newer = past[np.minimum(whole, last), self._fibers]
        older = past[np.minimum(whole + 1, last), self._fibers]
        return newer + part * (older - newer)


class Driven(Transport):
    """A score's transport with the drives behind it: wanted strains become commands, each ahead by its valve's response.

    The score runs ahead by the longest lead of all; fibers with a shorter one are given where they were that much ago.
    """

    resumes = True

    def __init__(self, rig: Rig, abilities: Abilities, tracks, cues: tuple[Cue, ...] = ()):
        super().__init__(tracks, abilities, cues)
        self._inverse = Inverse(rig, abilities)
        self._lags = Lags(self._inverse.lead_s, self.strain)
        self.lead_s = self._lags.lead_s
        self._down = SetDown(abilities)
        self._send(self.strain, 1.0)

    def tick(self, dt_s: float) -> str:
        """Let a tick pass and work out the command for it; what happened, as `Transport.tick`."""
        happened = super().tick(dt_s)
        self.strain = self._down.limited(self.strain, dt_s)
        self._send(self._lags.behind(self.strain, dt_s), dt_s)
        return happened

    def set_down(self, fiber: int) -> None:
        """Take one fiber out of the score, to rest and to stay there."""
        self._down.put(fiber, self.strain)

    def coming(self, after_s: Array) -> Array:
        """Strain (F,) that will be wanted, as `Transport.coming`, without the fibers that are taken out."""
        return self._down.coming(super().coming(after_s), after_s)

    def _send(self, strain: Array, dt_s: float) -> None:
        soon = self.coming(self._inverse.soon_s - self._lags.each_s)
        ahead = self.coming(LOOK_S - self._lags.each_s)
        self.command = self._inverse.commands(strain[:, None], soon[:, None], ahead[:, None], dt_s)[:, 0]
