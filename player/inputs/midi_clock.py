"""Following MIDI clock: 24 ticks a count, song position in sixteenths, start, stop, continue; places are counts.

After the MIDI 1.0 specification: start and continue take effect with the next tick, which then is the place itself.
"""

from player.inputs.beat import Beat, Steady
from player.inputs.events import Timing
from player.inputs.following import Follower

TICKS = 24
TICKS_A_SIXTEENTH = 6
COAST_S = 2.0
"""How long the last tempo is kept up when nothing comes any more."""

SLOWEST, FASTEST = 1.0, 1000.0
"""Counts a minute that a score may have; a clock outside is not followed."""

ENOUGH = 6
"""Ticks from which on their own tempo is believed."""


class ClockFollower(Follower):
    """Ticks in, the running tempo out. `state` is one of `player.inputs.turns.STATES`; `backwards` counts wrong moments."""

    def __init__(self, rate: float = 1.0, coast_s: float = COAST_S):
        """rate: counts a second to go by until enough ticks have come."""
        super().__init__(Steady(), coast_s)
        self._rate = rate
        self._tick = 0
        self._next = 0
        self._running = False
        self._placed: int | None = None
        self._gap: tuple[int, float] | None = None

    @property
    def rate(self) -> float:
        """Counts a second as far as they are known."""
        return self._rate

    def hear(self, event: Timing) -> None:
        """One message; kinds of time code mean nothing here."""
        at_s = self._in_order(event.at_s)
        if event.what == "clock":
            self._clock(at_s)
        elif event.what == "start":
            self._next, self._placed = 0, None
            self._starts(at_s, "started")
        elif event.what == "continue":
            self._starts(at_s, "goes on")
        elif event.what == "stop":
            if self._running:
                self._running = False
                self.state = "stopped"
                self._tell("stop", self._next / TICKS, at_s, "the clock has been stopped")
        elif event.what == "songpos":
            self._next, self._placed = event.value * TICKS_A_SIXTEENTH, None
            if not self._running:
                self.state = "stopped"
            self._tell("locate", self._next / TICKS, at_s, f"the clock has gone to count {self._next / TICKS + 1:g}")

    def tick(self, now_s: float) -> None:
        """Let time pass: a clock that runs and says nothing is coasted on, then held."""
        if self._running and self._placed is not None:
            after_s = max(0.1, 4.0 / (TICKS * self._rate))
            said = "the clock has said nothing for {quiet:.1f} s: "
            self._falls_silent(now_s, after_s, self._line_at, f"{said}going on at the last tempo", f"{said}standing")

    def beat(self, now_s: float) -> Beat | None:
        """The running tempo, of rate 0 where it stands; None before anything is known."""
        if self.state == "waiting":
            return None
        if self.state == "holding" or self.state == "wild":
            return Beat(self._held, now_s, 0.0)
        if not self._running or self._placed is None:
            return Beat(self._next / TICKS, now_s, 0.0)
        tick, at_s, rate = self._line()
        return Beat((self._placed + tick - self._tick) / TICKS, at_s, rate)

    def _starts(self, at_s: float, how: str) -> None:
        self._running, self._placed, self._gap = True, None, None
        self.state = "running"
        if self._last_s is None:
            # The silence that is waited out counts from here.
            self._last_s = at_s
        self._tell("run", self._next / TICKS, at_s, f"the clock {how} at count {self._next / TICKS + 1:g}")

    def _line(self) -> tuple[float, float, float]:
        """A tick, its moment, and counts a second there."""
        line = self._steady.line() if len(self._steady) >= ENOUGH else None
        if line is None:
            return self._tick, self._last_s or 0.0, self._rate
        tick, at_s, slope = line
        self._rate = 1.0 / (TICKS * slope)
        return tick, at_s, self._rate

    def _line_at(self, moment_s: float) -> float:
        tick, at_s, rate = self._line()
        placed = self._next if self._placed is None else self._placed
        return (placed + tick - self._tick) / TICKS + rate * (moment_s - at_s)

    def _clock(self, at_s: float) -> None:
        period_s = 1.0 / (TICKS * self._rate)
        since_s = at_s - self._last_s if self._last_s is not None else 0.0
        if len(self._steady) >= ENOUGH and since_s > max(0.1, 4.0 * period_s) and self._gap is None:
            self._comes_late(at_s, since_s, period_s)
            return
        if self._gap is not None:
            missed, came_s = self._gap
            self._gap = None
            if 0.7 * period_s < at_s - came_s < 1.4 * period_s:
                # The old tempo goes on: the ticks in between were sent and never came.
                self._pass(missed)
                self._steady.add(self._tick, came_s)
            else:
                self._steady.clear()
                self._steady.add(self._tick, came_s)
            self._again(at_s)
        self._pass(1)
        self._steady.add(self._tick, at_s)
        self._last_s = at_s
        self._sane(at_s)

    def _comes_late(self, at_s: float, since_s: float, period_s: float) -> None:
        """A tick after a gap: only the next can tell whether ticks were lost or the tempo has fallen."""
        if self.state == "holding" or since_s > self._coast_s:
            self._steady.clear()
            if self._running and self.state == "holding":
                self._next, self._placed = round(self._held * TICKS), None
            self._again(at_s)
            self._pass(1)
            self._steady.add(self._tick, at_s)
        else:
            self._pass(1)
            self._gap = (round(since_s / period_s) - 1, at_s)
        self._last_s = at_s

    def _again(self, at_s: float) -> None:
        if self._running and self.state in ("coasting", "holding"):
            self.state = "running"
            self._tell("again", self._next / TICKS, at_s, "the clock is there again")

    def _pass(self, ticks: int) -> None:
        """So many ticks have been."""
        self._tick += ticks
        if self._running and self.state != "wild":
            # The first tick after a start is the place itself.
            self._placed = self._next + ticks - 1
            self._next += ticks

    def _sane(self, at_s: float) -> None:
        """Whether the tempo is one that a score may have; asked now and then, as it takes a fit."""
        if self._tick % ENOUGH or len(self._steady) < 2 * ENOUGH:
            return
        line = self._steady.line()
        a_minute = 60.0 / (TICKS * line[2]) if line is not None else float("inf")
        sane = SLOWEST <= a_minute <= FASTEST
        if not sane and self.state != "wild":
            self._held = self._next / TICKS
            self.state = "wild"
            say = f"the clock runs at {a_minute:.0f} counts a minute, which no score has (1 to 1000): standing"
            self._tell("wild", self._held, at_s, say)
        elif sane and self.state == "wild":
            self.state = "running" if self._running else "stopped"
            self._placed = None
            self._tell("again", self._next / TICKS, at_s, "the clock runs at a tempo that can be followed again")
