"""Where the score is and what it wants of every fiber, tick by tick: play, pause, cues that wait, jumps, the way to rest.

No clock and no output in here: time is the length of the tick that the caller hands in.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.motion import Cursor
from composer.tracks import SAME_INSTANT_S, Tracks
from player.engine.holds import Holds
from player.engine.pace import Pace
from player.engine.ways import Ways, safe_ways

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Cue:
    """A named place of the score in seconds; with `wait` the player stops there until told to go on."""

    name: str
    at_s: float
    wait: bool = False


class Transport:
    """The score's motion under the operator's hand.

    position_s: where the score is; strain: (F,) where the fibers are wanted at the end of the last tick
    phase: "standing"; "bringing", fibers on their way to where the score has them; "playing"; "to rest"; "at rest"
    waiting: the cue that the score stands at until told to go on, if it does
    """

    def __init__(self, tracks: Tracks, abilities: Abilities, cues: tuple[Cue, ...] = ()):
        self.duration_s = float(tracks.duration_s)
        self.cues = tuple(sorted(cues, key=lambda cue: cue.at_s))
        self.position_s = 0.0
        self.strain = np.zeros(tracks.fibers)
        self.phase = "at rest"
        self.waiting: Cue | None = None
        self._abilities = abilities
        self._cursor = Cursor(tracks, abilities)
        self._scout = Cursor(tracks, abilities)
        self._pace = Pace(tracks, abilities)
        self._holds = Holds(abilities)
        self._held = self.strain
        self._then = ""
        self._goal_s = 0.0
        self._ways: Ways | None = None
        self._gone_s = 0.0
        self._stop: Cue | None = None

    @property
    def let_down(self) -> int:
        """How many fibers a long pause has let down."""
        return self._holds.let_down

    @property
    def next_cue(self) -> Cue | None:
        """The first cue that lies ahead."""
        return next((cue for cue in self.cues if cue.at_s > self.position_s + SAME_INSTANT_S), None)

    @property
    def cue(self) -> Cue | None:
        """The last cue that has been passed."""
        return next((cue for cue in reversed(self.cues) if cue.at_s <= self.position_s + SAME_INSTANT_S), None)

    def start(self, from_s: float = 0.0) -> None:
        """Bring the fibers to where the score has them at `from_s`, then play; a cue right there does not wait."""
        self._place(from_s)
        self._bring("play")

    def found(self, strain: Array) -> None:
        """Every fiber is at rest, or vented, and is found at these strains (F,): whatever comes next sets out from there."""
        self.strain, self._held = strain.copy(), strain.copy()
        self._ways, self.phase, self._then, self.waiting = None, "at rest", "", None
        self._pace.stand()
        self._holds.follow()

    def pause(self) -> None:
        """Ease to a stand and hold."""
        if self.phase == "playing":
            self._pace.wanted, self._then = 0.0, "stand" if self._then in ("", "stand") else "jump and stand"
        elif self.phase == "bringing":
            self._then = "stand"

    def go_on(self) -> None:
        """Go on from a pause or a waiting cue, the fibers first brought back to where the score has them."""
        self.waiting = None
        if self.phase == "bringing":
            self._then = "play"
        elif self.phase == "standing":
            self._bring("play")
        elif self.phase == "playing":
            jumps = self._then in ("jump", "jump and stand")
            self._pace.wanted, self._then = (0.0, "jump") if jumps else (1.0, "")

    def jump(self, to_s: float) -> None:
        """Ease to a stand, bring the fibers to where the score has them at `to_s`, and play, or stand, as before."""
        self._goal_s, self.waiting = to_s, None
        if self.phase == "playing":
            self._pace.wanted, self._then = 0.0, "jump" if self._then in ("", "jump") else "jump and stand"
        elif self.phase in ("standing", "bringing"):
            then = self._then if self.phase == "bringing" else "stand"
            self._place(to_s)
            self._bring(then)

    def rest(self) -> None:
        """Ease to a stand, then bring every fiber to rest at its safe rate."""
        self.waiting = None
        if self.phase == "playing":
            self._pace.wanted, self._then = 0.0, "rest"
        elif self.phase not in ("to rest", "at rest"):
            self._to_rest()

    def tick(self, dt_s: float) -> str:
        """Let a tick pass and leave in `strain` what is wanted at its end; what happened: "wait", "end", "at_rest" or ""."""
        if self._ways is not None:
            return self._along(self._ways, dt_s)
        happened = self._advance(dt_s) if self.phase == "playing" else ""
        if self._ways is None:
            self.strain = self._holds.limited(self._held, dt_s, paused=self.phase == "standing")
        return happened

    def coming(self, after_s: Array) -> Array:
        """Strain (F,) that will be wanted `after_s` (F,) seconds after the last tick, as far as anyone knows now."""
        if self._ways is not None:
            return self._ways.at(np.maximum(self._gone_s + after_s, 0.0))
        if self.phase != "playing" or self._pace.wanted < 1.0:
            return self.strain
        end = self._stop.at_s if self._stop else self.duration_s
        return self._scout.at(np.minimum(self.position_s + after_s, end))[0]

    def _place(self, at_s: float) -> None:
        self.position_s = min(max(at_s, 0.0), self.duration_s)
        self._stop = next((cue for cue in self.cues if cue.wait and cue.at_s > self.position_s + SAME_INSTANT_S), None)

    def _bring(self, then: str) -> None:
        """Begin the ways to where the score has every fiber at its present place."""
        self._held = self._cursor.at(self.position_s)[0]
        self._then, self.phase = then, "bringing"
        self._set_out(self._held)

    def _to_rest(self) -> None:
        self.phase, self._then = "to rest", ""
        self._set_out(np.zeros_like(self.strain))

    def _set_out(self, to: Array) -> None:
        self._ways, self._gone_s = safe_ways(self._abilities, self.strain, to), 0.0
        if self._ways.longest_s == 0.0 and self.phase == "bringing":
            self._arrive()

    def _along(self, ways: Ways, dt_s: float) -> str:
        self._gone_s += dt_s
        self.strain = ways.at(self._gone_s)
        self._holds.watch(self.strain, dt_s)
        if self._gone_s < ways.longest_s - SAME_INSTANT_S:
            return ""
        self.strain = ways.b
        if self.phase == "bringing":
            self._arrive()
            return ""
        self._ways, self._held, self.phase = None, ways.b, "at rest"
        return "at_rest"

    def _arrive(self) -> None:
        """All are where the score has them: play, or stand there."""
        self._ways = None
        self._holds.follow()
        self.phase = "playing" if self._then == "play" else "standing"
        self._then = ""
        self._pace.begin(self.position_s)

    def _advance(self, dt_s: float) -> str:
        """Move the score's place on by a tick, no further than a cue that waits or the end."""
        end = self._stop.at_s if self._stop else self.duration_s
        step = self._pace.step(self.position_s, dt_s, end if self._stop else None)
        self.position_s += step
        happened = ""
        if self.position_s >= end - SAME_INSTANT_S:
            self.position_s = end
            happened = "wait" if self._stop else "end"
        self._held = self._cursor.at(self.position_s)[0]
        if not happened and (self._pace.speed > 0.0 or self._pace.wanted > 0.0):
            return ""
        then, self._then, self.phase = self._then, "", "standing"
        if happened == "wait" and not then:
            self.waiting = self._stop
        self._pace.stand()
        self._place(self.position_s)
        if then.startswith("jump"):
            self._place(self._goal_s)
            self._bring("play" if then == "jump" else "stand")
        elif then == "rest":
            self._to_rest()
        return happened if not then else ""
