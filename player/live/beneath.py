"""What lies under the hands: nothing, a score by the player's own time, or a score that follows a clock from outside."""

from collections.abc import Callable
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.motion import Cursor
from composer.score.tempo import TempoMap
from composer.tracks import SAME_INSTANT_S, Tracks
from player.engine.transport import Cue, Transport
from player.inputs.beat import Beat
from player.inputs.midi_clock import ClockFollower
from player.inputs.mtc import CodeFollower

Array = NDArray[np.float64]

USUAL = 1.0
"""Counts a second where there is no score, no clock and no tapped tempo."""


class Beneath(Protocol):
    """What `Live` asks of it; names as in `player.engine.source.Source`.

    follows: whether a clock from outside says where it is, so that nobody here can jump; runs: whether its place moves on
    """

    strain: Array
    position_s: float
    duration_s: float
    phase: str
    cue: Cue | None
    next_cue: Cue | None
    waiting: Cue | None
    follows: bool

    @property
    def runs(self) -> bool:
        """Whether its place moves on by itself, fibers being where it has them."""

    def start(self, from_s: float = 0.0) -> None:
        """Begin from a place."""

    def found(self, strain: Array) -> None:
        """Fibers are found at these strains (F,)."""

    def pause(self) -> None:
        """Stand."""

    def go_on(self) -> None:
        """Go on."""

    def jump(self, to_s: float) -> None:
        """Go to another place."""

    def pass_tick(self, dt_s: float, now_s: float, moment_s: float) -> str:
        """Let a tick pass that takes effect at `moment_s`; what happened, as `Transport.tick`."""

    def beat(self, moment_s: float) -> Beat | None:
        """The running tempo in counts, of rate 0 where it stands; None where there is none."""

    def tempo(self) -> float:
        """Counts a second at its place, whether it stands or not."""

    def coming(self, after_s: Array) -> Array:
        """Strain (F,) that it will want so many seconds after the last tick."""


class Nothing:
    """No score: a place that moves on as time does, for takes, and all fibers wanted at rest."""

    follows, duration_s = False, 0.0
    cue: Cue | None = None
    next_cue: Cue | None = None
    waiting: Cue | None = None

    def __init__(self, fibers: int):
        self.strain = np.zeros(fibers)
        self.position_s, self.phase = 0.0, "at rest"

    @property
    def runs(self) -> bool:
        """Whether time passes."""
        return self.phase == "playing"

    def start(self, from_s: float = 0.0) -> None:
        """Time passes from there on."""
        self.position_s, self.phase = from_s, "playing"

    def found(self, strain: Array) -> None:
        """All are wanted at rest wherever they are."""

    def pause(self) -> None:
        """Time stands."""
        self.phase = "standing"

    def go_on(self) -> None:
        """Time passes again."""
        self.phase = "playing"

    def jump(self, to_s: float) -> None:
        """There is nowhere to go."""

    def pass_tick(self, dt_s: float, now_s: float, moment_s: float) -> str:
        """A tick of time."""
        self.position_s += dt_s if self.runs else 0.0
        return ""

    def beat(self, moment_s: float) -> Beat | None:
        """None."""
        return None

    def tempo(self) -> float:
        """The usual one."""
        return USUAL

    def coming(self, after_s: Array) -> Array:
        """Rest."""
        return self.strain


class Own(Transport):
    """A score by the player's own time."""

    follows = False

    def __init__(self, tracks: Tracks, abilities: Abilities, cues: tuple[Cue, ...], tempo: TempoMap):
        super().__init__(tracks, abilities, cues)
        self._tempo = tempo

    @property
    def runs(self) -> bool:
        """Whether the score plays."""
        return self.phase == "playing"

    def pass_tick(self, dt_s: float, now_s: float, moment_s: float) -> str:
        """A tick of the score."""
        return self.tick(dt_s)

    def beat(self, moment_s: float) -> Beat | None:
        """The score's own."""
        return Beat(float(self._tempo.counts(self.position_s)), moment_s, self.tempo() if self.runs else 0.0)

    def tempo(self) -> float:
        """The score's at its place."""
        return tempo_at(self._tempo, self.position_s)


class Followed:
    """A score that is where a clock from outside says: the governor brings the fibers there as fast as they can."""

    follows = True
    waiting: Cue | None = None

    def __init__(
        self, tracks: Tracks, abilities: Abilities, cues: tuple[Cue, ...], tempo: TempoMap,
        follower: ClockFollower | CodeFollower, tell: Callable[[str], None],
    ):  # fmt: skip
        self.follower = follower
        self.cues = tuple(sorted(cues, key=lambda cue: cue.at_s))
        self.duration_s, self.position_s = float(tracks.duration_s), 0.0
        self.strain = np.zeros(tracks.fibers)
        self.phase = "at rest"
        self._cursor, self._scout = Cursor(tracks, abilities), Cursor(tracks, abilities)
        self._tempo, self._tell = tempo, tell
        self._counts = isinstance(follower, ClockFollower)
        self._beat: Beat | None = None
        self._paused = False

    @property
    def runs(self) -> bool:
        """Whether the clock runs and the score goes with it."""
        return self.phase == "playing" and 0.0 < self.position_s < self.duration_s

    @property
    def cue(self) -> Cue | None:
        """The last cue that has been passed."""
        return next((cue for cue in reversed(self.cues) if cue.at_s <= self.position_s + SAME_INSTANT_S), None)

    @property
    def next_cue(self) -> Cue | None:
        """The first cue that lies ahead."""
        return next((cue for cue in self.cues if cue.at_s > self.position_s + SAME_INSTANT_S), None)

    def start(self, from_s: float = 0.0) -> None:
        """Stand at the place until the clock has one."""
        self.position_s, self.phase, self._paused = from_s, "standing", False
        self.strain = self._cursor.at(self.position_s)[0]

    def found(self, strain: Array) -> None:
        """The governor brings all to where the score has them from wherever they are."""

    def pause(self) -> None:
        """Stand, whatever the clock does."""
        self._paused = True

    def go_on(self) -> None:
        """Go with the clock again."""
        self._paused = False

    def jump(self, to_s: float) -> None:
        """It is the clock that says where the score is."""
        self._tell("the score follows a clock: go to another place there")

    def pass_tick(self, dt_s: float, now_s: float, moment_s: float) -> str:
        """Go to where the clock will be at `moment_s`."""
        self.follower.tick(now_s)
        for turn in self.follower.turns():
            self._tell(turn.say)
        beat = self.follower.beat(now_s)
        if beat is None or self._paused:
            self.phase, self._beat = "standing", None
            return ""
        place = beat.at(moment_s)
        seconds = float(self._tempo.seconds(place)) if self._counts else place
        self.position_s = min(max(seconds, 0.0), self.duration_s)
        self.phase = "playing" if beat.rate > 0.0 else "standing"
        rate = beat.rate if self._counts else self.tempo() * beat.rate
        self._beat = Beat(float(self._tempo.counts(seconds)), moment_s, rate)
        self.strain = self._cursor.at(self.position_s)[0]
        return ""

    def beat(self, moment_s: float) -> Beat | None:
        """The clock's, in counts of the score."""
        return self._beat

    def tempo(self) -> float:
        """The clock's, or the score's while it stands."""
        if self._counts and self._beat is not None and self._beat.rate > 0.0:
            return self._beat.rate
        return tempo_at(self._tempo, self.position_s)

    def coming(self, after_s: Array) -> Array:
        """As the score goes on if the clock does."""
        if not self.runs or self._beat is None:
            return self.strain
        pace = self._beat.rate / max(tempo_at(self._tempo, self.position_s), 1e-9)
        return self._scout.at(np.minimum(self.position_s + pace * np.maximum(after_s, 0.0), self.duration_s))[0]


def tempo_at(tempo: TempoMap, position_s: float) -> float:
    """Counts a second at a place of a score."""
    ends = tempo.counts(np.array([position_s, position_s + 1e-3]))
    return float((ends[1] - ends[0]) * 1e3)
