"""MIDI clock to be sent: which messages are due when, so that a sequencer keeps with the score. No port in here."""

import math

from mido import Message

from player.inputs.beat import Beat
from player.inputs.midi_clock import TICKS, TICKS_A_SIXTEENTH

LAST_SIXTEENTH = 16383
MOST_MESSAGES = 1000
"""Messages of one call; a call for a stretch that asks for more sends these and goes on from there at the next."""


class ClockSender:
    """The running score in, messages with their moments out: start at its beginning, song position and continue elsewhere."""

    def __init__(self) -> None:
        self._next: int | None = None

    def until(self, beat: Beat | None, now_s: float, until_s: float) -> list[tuple[float, Message]]:
        """What is to be sent from now on and before `until_s`; a beat of rate 0, or none, stops the receiver."""
        out: list[tuple[float, Message]] = []
        if beat is None or beat.rate <= 0.0:
            return self._stop(now_s)
        # A place that lies more than half a sixteenth beside the next tick is a jump, not a change of tempo.
        if self._next is not None and abs(beat.at(now_s) * TICKS - self._next) > TICKS_A_SIXTEENTH / 2 + beat.rate * TICKS * (
            until_s - now_s
        ):
            out += self._stop(now_s)
        if self._next is None:
            sixteenth = max(0, math.ceil(beat.at(now_s) * TICKS / TICKS_A_SIXTEENTH - 1e-6))
            if sixteenth > LAST_SIXTEENTH:
                return out
            if sixteenth == 0:
                out.append((now_s, Message("start")))
            else:
                out += [(now_s, Message("songpos", pos=sixteenth)), (now_s, Message("continue"))]
            self._next = sixteenth * TICKS_A_SIXTEENTH
        while (at_s := beat.when(self._next / TICKS)) < until_s and len(out) < MOST_MESSAGES:
            out.append((max(at_s, now_s), Message("clock")))
            self._next += 1
        return out

    def _stop(self, now_s: float) -> list[tuple[float, Message]]:
        if self._next is None:
            return []
        self._next = None
        return [(now_s, Message("stop"))]
