"""A recording under the operator's hand: its sets come again at their own times, and it can be paused and brought to rest."""

import numpy as np
from numpy.typing import NDArray

from composer.drive.inverse import is_valve_drive, vented
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from player.engine.transport import Cue
from player.engine.ways import SAFE, safe_ways

Array = NDArray[np.float64]

OPENING = 2.0 / 3.0
"""How far valves open to let fibers down that are driven by their opening: the safe rate is this share of the fastest."""


class Playback:
    """Sets at (N,) times in s, from 0 on, with commands (N, F) in drive units; other attributes as `Source` has them.

    A recording knows sets, not strains: `strain` is None, and the way to rest goes by the sets alone. A set-point is let
    down in as long as a fiber needs from full stroke at its safe rate; a valve's opening exhausts for as long.
    """

    strain: Array | None = None
    lead_s = 0.0
    waiting: Cue | None = None
    cue: Cue | None = None
    next_cue: Cue | None = None
    let_down = 0
    resumes = False

    def __init__(self, rig: Rig, abilities: Abilities, time_s: Array, commands: Array, at_rest: bool = False):
        """`at_rest`: the boards were told to rest after the last set, so all fibers were there already."""
        self.position_s = 0.0
        self.duration_s = float(time_s[-1])
        self.phase = "at rest"
        self._time_s, self._commands = time_s, commands
        self._valve = is_valve_drive(rig)
        self._shut = np.where(self._valve, 0.0, 1.0)
        self._open = vented(rig) * OPENING
        self.command = np.zeros(len(rig.fibers))
        ways = safe_ways(abilities, abilities.stroke, np.zeros_like(abilities.stroke))
        # A valve's way at 2/3 open takes no longer than the smooth way whose peak rate is 2/3 of the fastest.
        self._takes_s = max(ways.longest_s, 1e-3) * SAFE
        self._from = self.command
        self._gone_s = 0.0
        self._next_s = 0.0
        self._ends_at_rest = at_rest
        self._over = False

    def start(self, from_s: float = 0.0) -> None:
        """Begin with the first set; a recording has no other place to begin from, as it does not say what came before."""
        self.phase = "playing"

    def found(self, strain: Array) -> None:
        """A recording begins with its first set alone, whatever was before."""

    def pause(self) -> None:
        """Hold the last set-points, valves shut."""
        self.phase = "standing"

    def go_on(self) -> None:
        """Go on with the next set."""
        self.phase = "playing"

    def jump(self, to_s: float) -> None:
        """A recording is only played through."""

    def rest(self) -> None:
        """Let all down."""
        if self.phase == "at rest" or (self._over and self._ends_at_rest):
            self.phase = "at rest"
        elif self.phase != "to rest":
            self.phase, self._from, self._gone_s = "to rest", self.command.copy(), 0.0

    def set_down(self, fiber: int) -> None:
        """A recording knows no strains, so no alarm of one is raised, and none is taken out."""

    def tick(self, dt_s: float) -> str:
        """The set whose time has come, within half a tick."""
        if self.phase == "playing":
            self.position_s = min(self._next_s, self.duration_s)
            at = int(np.searchsorted(self._time_s, self._next_s + 0.5 * dt_s, side="left")) - 1
            self._next_s += dt_s
            self.command = self._commands[max(at, 0)]
            if at >= len(self._time_s) - 1:
                self.phase, self._over = "standing", True
                return "end"
        elif self.phase == "standing":
            self.command = self.command * self._shut
        elif self.phase == "to rest":
            self._gone_s += dt_s
            share = min(1.0, self._gone_s / self._takes_s)
            left = 1.0 - share**3 * (10.0 + share * (6.0 * share - 15.0))
            self.command = np.where(self._valve, self._open, self._from * left)
            if share >= 1.0:
                self.command = np.zeros_like(self.command)
                self.phase = "at rest"
                return "at_rest"
        return ""
