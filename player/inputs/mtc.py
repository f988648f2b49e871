"""Following MIDI time code: quarter frames and full frames, forwards; places are seconds of the score.

After the MIDI Time Code detailed specification: eight quarter frames spell the label of the frame in which the first of
them was sent, so they are two frames old when the next begin.
"""

from fractions import Fraction

from player.inputs.beat import Beat, Steady
from player.inputs.events import Timing
from player.inputs.following import Follower
from player.inputs.timecode import RATES, Rate, Stamp, frames_of, is_label, seconds_of

PIECES = 8
COAST_S = 0.5
"""Time code has no message for a stop: it just ends. So it is not coasted on for as long as a clock is."""

QUIET_S = 0.1
BACKWARDS = 4
"""Pieces in falling order after which the code runs backwards."""

VARISPEED = 1.25
"""How much faster or slower than its frame rate says time code is taken to run."""

MIDNIGHT = Stamp(0, 0, 0, 0)


class CodeFollower(Follower):
    """Quarter frames in, the running score out. `state` is one of `player.inputs.turns.STATES`.

    invalid: labels that no frame has, counted; backwards: pieces in falling order, or at earlier moments, counted
    """

    def __init__(self, start: Stamp = MIDNIGHT, coast_s: float = COAST_S):
        """start: the label at which the score begins."""
        super().__init__(Steady(most=192, fewest=24), coast_s)
        self.rate: Rate | None = None
        self.invalid = 0
        self._start = start
        self._pieces = [0] * PIECES
        self._run = 0
        self._falling = 0
        self._last_piece = -1
        self._quarter: int | None = None
        self._kept: Beat | None = None

    def hear(self, event: Timing) -> None:
        """One message; those of MIDI clock mean nothing here."""
        at_s = self._in_order(event.at_s)
        if event.what == "quarter_frame":
            self._piece(event.value >> 4 & 7, event.value & 15, at_s)
        elif event.what == "full_frame":
            self._full(event.value, at_s)

    def tick(self, now_s: float) -> None:
        """Let time pass: code that has ended is coasted on for a moment, then held."""
        held = "time code has said nothing for {quiet:.1f} s: standing"
        self._falls_silent(now_s, QUIET_S, self._place_at, "time code has ended: going on for a moment", held)

    def beat(self, now_s: float) -> Beat | None:
        """The running place in seconds of the score, of rate 0 where it stands; None before anything is known."""
        if self.state == "waiting":
            return None
        if self.state not in ("running", "coasting"):
            return Beat(self._held, now_s, 0.0)
        if self._quarter is None or self.rate is None:
            # A piece was lost: until the label is spelt again, the line through those before it holds.
            return self._kept
        quarter, at_s, slope = self._line()
        return Beat(self._seconds(quarter), at_s, 1.0 / (4.0 * float(self.rate.per_s) * slope))

    def _line(self) -> tuple[float, float, float]:
        assert self.rate is not None and self._quarter is not None
        usual = 1.0 / (4.0 * float(self.rate.per_s))
        line = self._steady.line() if len(self._steady) >= PIECES else None
        if line is None:
            return self._quarter, self._last_s or 0.0, usual
        quarter, at_s, slope = line
        # Pieces that a busy host hands over in a bunch are no tempo: where the code is follows from them, how fast it goes not.
        return quarter, at_s, min(max(slope, usual / VARISPEED), usual * VARISPEED)

    def _place_at(self, moment_s: float) -> float:
        beat = self.beat(moment_s)
        return beat.at(moment_s) if beat is not None else 0.0

    def _seconds(self, quarter: float) -> float:
        """Seconds of the score at a quarter frame counted from midnight."""
        assert self.rate is not None
        return float(Fraction(quarter) / (4 * self.rate.per_s) - seconds_of(self._start, self.rate))

    def _piece(self, piece: int, nibble: int, at_s: float) -> None:
        rising = piece == (self._last_piece + 1) % PIECES
        falling = self._last_piece >= 0 and piece == (self._last_piece - 1) % PIECES
        late = self._last_s is not None and at_s - self._last_s > self._coast_s
        self._last_piece, self._last_s = piece, at_s
        self._pieces[piece] = nibble
        self._falling = self._falling + 1 if falling else 0
        if falling:
            self.backwards += 1
        if self._falling >= BACKWARDS and self.state in ("running", "coasting"):
            self._held, self.state = self._place_at(at_s), "wild"
            self._tell("wild", self._held, at_s, "time code runs backwards: standing")
        if not rising or late:
            self._lose()
        if piece == 0:
            self._run = 0
        self._run += 1
        if self._quarter is not None:
            self._quarter += 1
            self._steady.add(self._quarter, at_s)
        if piece == PIECES - 1 and self._run == PIECES:
            self._spelt(at_s)

    def _lose(self) -> None:
        """The thread is lost until eight pieces have come in their order again."""
        if self._quarter is not None and self._last_s is not None:
            self._kept = self.beat(self._last_s)
        self._quarter, self._run = None, -PIECES
        self._steady.clear()

    def _spelt(self, at_s: float) -> None:
        """Eight pieces have spelt a label."""
        low, high = self._pieces[0::2], self._pieces[1::2]
        frames, seconds, minutes, hours = (a | b << 4 for a, b in zip(low, high, strict=True))
        rate = RATES[hours >> 5 & 3]
        stamp = Stamp(hours & 31, minutes & 63, seconds & 63, frames & 31)
        if not is_label(stamp, rate):
            self.invalid += 1
            self._lose()
            return
        quarter = 4 * frames_of(stamp, rate) + PIECES - 1
        again = self.state in ("running", "coasting") and self.rate is rate and self._quarter == quarter
        if not again:
            was, self.rate = self.state, rate
            self._steady.clear()
            self._quarter = quarter
            self._steady.add(quarter, at_s)
            place = self._seconds(quarter)
            kind = "locate" if was in ("running", "coasting") else "run"
            self._tell(kind, place, at_s, f"time code {stamp} at {rate.name}: {place:.2f} s of the score")
        elif self.state == "coasting":
            self._tell("again", self._seconds(quarter), at_s, "time code is there again")
        self.state = "running"

    def _full(self, value: int, at_s: float) -> None:
        hours, minutes, seconds, frames = value.to_bytes(4, "big")
        rate, stamp = RATES[hours >> 5 & 3], Stamp(hours & 31, minutes, seconds, frames)
        if not is_label(stamp, rate):
            self.invalid += 1
            return
        self._lose()
        self.rate, self._last_s = rate, at_s
        self._held = self._seconds(4 * frames_of(stamp, rate))
        self.state = "stopped"
        self._tell("locate", self._held, at_s, f"time code has gone to {stamp} at {rate.name}")
