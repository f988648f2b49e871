"""The source that is played by hand: events in, what the hands and the score want, the governor, and commands for the drives.

Each tick: what has come in is taken; the score moves on; the hands are laid over it; the governor says what may be; the
inverse says what is sent for it. No port and no clock in here: both are handed in.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from composer.drive.inverse import LOOK_S, Inverse
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from player.engine.source import Lags
from player.engine.transport import Cue
from player.governor import begin, govern, governor_of, standing_at
from player.governor.causes import NONE
from player.inputs.beat import Beat
from player.inputs.events import Ask, Back, Begin, End, Event, HoldToRun, Silent, Timing
from player.inputs.tap import TapTempo
from player.live.beneath import Beneath, Followed
from player.live.hand import Hand, Shares
from player.live.repertoire import Repertoire

Array = NDArray[np.float64]

PULL = 0.02
"""Of the distance between the ticks' own time and the clock's, this share is taken up in a tick: its jitter is not."""

AFRESH_S = 0.02
"""Further apart than this the host has stood still, and the ticks' time begins anew."""

KEYBOARD = "keyboard"


class Inputs(Protocol):
    """Where events come from; what they need to know of the player is handed to them each tick."""

    def poll(self, now_s: float, present: Array, beat: Beat | None) -> Sequence[Event]:
        """What has come in; `present` (F,) shares of stroke wanted now, `beat` the running tempo."""


@dataclass(frozen=True, slots=True, eq=False)
class View:
    """What a screen, a log and a take want to see of a tick; nobody writes into its arrays.

    wanted, allowed: (F,) strain; cut: (F,) int8, index into `CAUSES`; by: (F,) strain wanted less allowed; touched: (F,) bool
    air_share: of the air asked for; air_left: share of the receiver's usable air, as reckoned
    counts_a_minute: the running tempo; held: whether the hold-to-run is down, True where none is wanted
    """

    wanted: Array
    allowed: Array
    cut: NDArray[np.int8]
    by: Array
    touched: NDArray[np.bool_]
    air_share: float
    air_left: float
    counts_a_minute: float
    held: bool
    binds_playing: frozenset[int]


class Live:
    """A `Source` under the hands; attributes as `player.engine.source.Source` has them.

    latency_s: how long after a tick what it wants is in force, set by whoever knows the engine
    """

    resumes = True

    def __init__(
        self, rig: Rig, abilities: Abilities, beneath: Beneath, inputs: Inputs, now: Callable[[], float],
        ask: Callable[..., None], tell: Callable[[str], None], repertoire: Repertoire | None = None,
        longest_tick_s: float = 0.01, hold_to_run: bool = False, cues: tuple[Cue, ...] = (),
    ):  # fmt: skip
        """ask: of the engine, as `Engine.ask`; hold_to_run: a pedal or key must be held, or all comes to rest."""
        self._beneath, self._inputs, self._now, self._ask, self._tell = beneath, inputs, now, ask, tell
        self._repertoire, self._cues = repertoire, {cue.name: cue for cue in cues}
        self._governor = governor_of(rig, abilities, longest_tick_s)
        self._state = begin(self._governor)
        self._hand = Hand(abilities.stroke, self._perform)
        self._stroke = abilities.stroke
        self._inverse = Inverse(rig, abilities)
        self._lags = Lags(self._inverse.lead_s, self._state.strain)
        self.lead_s = self._lags.lead_s
        self.latency_s = self.lead_s
        self._taps, self._tapped = TapTempo(), None
        self._hold_to_run, self._holders = hold_to_run, set[str]()
        self._phase = "at rest"
        self._begun = False
        self._paused = False
        self._stood_s = 0.0
        self._clock_s: float | None = None
        self._moment = 0.0
        self._down = np.zeros(len(self._stroke), dtype=bool)
        self._wanted = self._state.strain
        self.strain: Array | None = self._state.strain
        self._send(1.0)

    @property
    def position_s(self) -> float:
        """Where the score is, or for how long has been played."""
        return self._beneath.position_s

    @property
    def duration_s(self) -> float:
        """Of the score, 0 for none."""
        return self._beneath.duration_s

    @property
    def cue(self) -> Cue | None:
        """The last cue that has been passed."""
        return self._beneath.cue

    @property
    def next_cue(self) -> Cue | None:
        """The first cue ahead."""
        return self._beneath.next_cue

    @property
    def waiting(self) -> Cue | None:
        """The cue that the score waits at; the hands go on playing."""
        return self._beneath.waiting

    @property
    def let_down(self) -> int:
        """How many fibers have been held for as long as they may."""
        return int(np.count_nonzero(self._state.let_down))

    @property
    def phase(self) -> str:
        """As of `Transport`, and "to be held" while the hold-to-run is up."""
        if self._phase != "playing":
            return self._phase
        return self._beneath.phase if self._begun else "to be held"

    @property
    def records(self) -> bool:
        """Whether what is played now belongs into a take: the place moves on, and not by bringing fibers to it."""
        return self._phase == "playing" and self._begun and self._beneath.runs

    @property
    def held(self) -> bool:
        """Whether it may run: the hold-to-run is down, or none is wanted."""
        return bool(self._holders) or not self._hold_to_run

    @property
    def view(self) -> View:
        """The tick that has just been taken."""
        state, governor = self._state, self._governor
        room = governor.store_L
        return View(
            self._wanted, state.strain, state.cut, state.by, self._hand.touched, state.air_share,
            1.0 - state.air_missing_L / room if room > 0.0 else 1.0, 60.0 * self._tempo(), self.held,
            frozenset(self._hand.binds_playing),
        )  # fmt: skip

    def start(self, from_s: float = 0.0) -> None:
        """Begin from a place; a rig that is to be held stays at rest until it is."""
        self._phase, self._paused, self._begun = "playing", False, False
        self._beneath.position_s = from_s
        self._hand.release()
        self._inverse.reset(self._state.strain)
        self._begin_if_held()

    def found(self, strain: Array) -> None:
        """Every fiber is at rest or vented, found at these strains (F,); what hands wanted before is forgotten."""
        self._state = standing_at(self._governor, self._state, strain)
        self.strain = self._wanted = self._state.strain
        self._beneath.found(strain)
        self._hand.release()
        self._phase = "at rest"

    def pause(self) -> None:
        """The score stands, the hands count no more, the fibers hold."""
        self._paused = True
        self._beneath.pause()

    def go_on(self) -> None:
        """The score goes on, and the hands count again."""
        self._paused = False
        self._beneath.go_on()

    def jump(self, to_s: float) -> None:
        """Go to another place of the score."""
        self._beneath.jump(to_s)

    def rest(self) -> None:
        """All hands let go, and every fiber comes to rest at its safe rate."""
        if self._phase == "playing":
            self._hand.release()
            self._beneath.pause()
            self._phase = "to rest" if np.any(self._state.strain > 0.0) else "at rest"

    def set_down(self, fiber: int) -> None:
        """Take one fiber out of what is played, to rest and to stay there."""
        self._down[fiber] = True

    def let_go(self) -> None:
        """The score, or rest, has every fiber again."""
        self._hand.release()

    def hold(self, source: str, down: bool) -> None:
        """A hold-to-run goes down or up."""
        if down:
            self._holders.add(source)
            self._begin_if_held()
        else:
            self._holders.discard(source)
            if not self.held and self._phase == "playing" and self._begun:
                # The engine does it, before the next tick: it is the engine that knows what state all are in.
                self._tell("let go: all comes to rest")
                self._ask("rest")

    def idle(self) -> None:
        """Nothing is played: what comes in is heard, and moves nothing."""
        now = self._now()
        for event in self._inputs.poll(now, self._state.strain / self._stroke, None):
            if isinstance(event, HoldToRun):
                self.hold(event.source, event.down)
            elif isinstance(event, Ask) and event.what == "vent":
                self._ask("vent")
            elif isinstance(event, Silent):
                self._tell(event.why)

    def tick(self, dt_s: float) -> str:
        """Let a tick pass and work out its command."""
        now = self._now()
        moment = self._moment = self._ticks_time(now, dt_s) + self.latency_s + dt_s
        share = np.clip(self._wanted / self._stroke, 0.0, 1.0)
        for event in self._inputs.poll(now, share, self._beat(moment - dt_s)):
            self._take(event, moment)
        if self._phase in ("to rest", "at rest"):
            return self._down_to_rest(dt_s)
        happened = self._beneath.pass_tick(dt_s, now, moment) if self._begun else ""
        if self._paused or not self._begun:
            self._stood_s += dt_s
        else:
            self._hand.tick(moment - self._stood_s, self._state.strain)
        score = self._beneath.strain if self._begun else np.zeros_like(self._stroke)
        self._wanted = self._hand.over(score)
        self._state = govern(self._governor, self._state, self._wanted, dt_s, self._hand.to_rest | self._down)
        self.strain = self._state.strain
        self._send(dt_s)
        return happened

    def _down_to_rest(self, dt_s: float) -> str:
        self._wanted = np.zeros_like(self._stroke)
        self._state = govern(self._governor, self._state, self._wanted, dt_s, np.ones(len(self._stroke), dtype=bool))
        self.strain = self._state.strain
        self._send(dt_s)
        if self._phase == "at rest" or np.any(self.strain > 0.0):
            return ""
        self._phase = "at rest"
        return "at_rest"

    def _begin_if_held(self) -> None:
        if self._phase == "playing" and not self._begun and self.held:
            self._begun = True
            self._beneath.start(self._beneath.position_s)

    def _take(self, event: Event, moment: float) -> None:
        if isinstance(event, Ask):
            self._asked(event)
        elif isinstance(event, HoldToRun):
            self.hold(event.source, event.down)
        elif isinstance(event, Timing):
            if isinstance(self._beneath, Followed):
                self._beneath.follower.hear(event)
        elif isinstance(event, Back):
            self._tell(f"{event.source}: there again; its controls count once they are moved")
        elif isinstance(event, Silent):
            self._tell(event.why + (f"; {len(event.fibers)} fibers come to rest" if event.fibers else ""))
            self._hand.take(event)
        elif isinstance(event, End):
            self._hand.take(event)
        elif self._paused or not self._begun or self._phase != "playing":
            # Nothing starts while all hold: what a hand does then counts once it moves again.
            return
        elif isinstance(event, Begin):
            self._hand.take(replace(event, at_s=max(event.at_s, moment) - self._stood_s))
        else:
            self._hand.take(event)

    def _asked(self, event: Ask) -> None:
        if event.what == "tap_tempo":
            self._tapped = self._taps.tap(event.at_s) or self._tapped
        elif event.what == "cue":
            if event.name in self._cues:
                self._ask("jump", self._cues[event.name].at_s)
        elif event.what == "go_on" and not self._paused and self.waiting is None:
            self._tell("'go_on' was asked for, but nothing waits")
        else:
            self._ask(event.what)

    def _perform(self, event: Begin) -> Shares:
        if self._repertoire is None:
            return lambda gone_s: (np.zeros_like(self._stroke), True)
        return self._repertoire.perform(event.phrase, event.fibers, self._tempo())

    def _beat(self, moment: float) -> Beat | None:
        """The running tempo for starts that wait for it: the followed clock's, a tapped one, or the score's."""
        if self._tapped is not None and not self._beneath.follows:
            return self._tapped
        return self._beneath.beat(moment)

    def _tempo(self) -> float:
        if self._tapped is not None and not self._beneath.follows:
            return self._tapped.rate
        return self._beneath.tempo()

    @property
    def beat(self) -> Beat | None:
        """The score's own running tempo at the tick just taken, for clocks that are sent."""
        if self._clock_s is None or not self._begun or self._phase != "playing":
            return None
        return self._beneath.beat(self._moment)

    def _ticks_time(self, now: float, dt_s: float) -> float:
        """The time of this tick, without the jitter with which the host comes to it."""
        expected = now if self._clock_s is None else self._clock_s + dt_s
        off = now - expected
        self._clock_s = now if abs(off) > AFRESH_S else expected + PULL * off
        return self._clock_s

    def _send(self, dt_s: float) -> None:
        strain = self._lags.behind(self._state.strain, dt_s)
        soon = ahead = strain
        if self._phase == "playing" and self._begun and not self._paused:
            # Where neither a hand nor the governor has a say, the score's own future makes its fibers ready.
            known = ~self._hand.touched & (self._state.cut == NONE) & ~self._down
            if known.any():
                soon = np.where(known, self._beneath.coming(self._inverse.soon_s - self._lags.each_s), strain)
                ahead = np.where(known, self._beneath.coming(LOOK_S - self._lags.each_s), strain)
        self.command = self._inverse.commands(strain[:, None], soon[:, None], ahead[:, None], dt_s)[:, 0]
