"""What is said to a board and what state that leaves the link in: the ground that the host's side stands on."""

from collections import deque
from dataclasses import dataclass
from typing import Any

from player.wire import messages as m
from player.wire.clock import TURN, Clock
from player.wire.frames import FrameReader, frame
from player.wire.line import PINGS_HZ
from player.wire.link import FAILED, GREETING, SHUT, TRANSITIONS, VENTED, VENTING, Event, Moved, Trouble

VENT_AGAIN_S = 0.05
VENT_TRIES = 40


@dataclass(slots=True)
class Asked:
    """What waits for its answer."""

    message: Any
    seq: int
    first_s: float
    again_s: float
    left: int


class Talk:
    """What one line to one board has said and heard, and how it goes on. Times are seconds of the host's steady clock.

    channels: how many the rig uses on this board; rig: its fingerprint; watchdog_ms: the board vents after such a silence
    reply_s, tries: how long to wait for an answer, and how often; silence_s: how long a board may say nothing
    state: one of link.STATES; board: its hello, once greeted; status, queued, supply_kPa: from its last state (None: unknown)
    late, bad: sets late and frames dropped, as the board counts them, since the greeting
    skipped: calls of `set` of which nothing was sent; unreadable: frames from the board that were none
    """

    def __init__(
        self,
        channels: int,
        rig: int,
        *,
        watchdog_ms: int = 250,
        reply_s: float = 0.5,
        tries: int = 10,
        silence_s: float = 0.5,
    ) -> None:
        self.channels, self.rig, self.watchdog_ms = channels, rig, watchdog_ms
        self.state = SHUT
        self.board: Any = None
        self.clock = Clock()
        self.status: int | None = None
        self.frames = 0
        self.queued = self.late = self.bad = self.skipped = self.echoes = self.unknown = 0
        self.supply_kPa: float | None = None
        self.trouble: Trouble | None = None
        self.heard_s: float | None = None
        self._reply_s, self._tries, self._silence_s = reply_s, tries, silence_s
        self._ping_s = min(1.0 / PINGS_HZ, watchdog_ms / 4000.0)
        self._next_ping_s = 0.0
        self._silent = False
        self._seq = 0
        self._asked: Asked | None = None
        self._ramp_end_s = 0.0
        self._base: tuple[int, int] | None = None
        self._newest_us: int | None = None
        self._pings: dict[int, float] = {}
        self._flying: deque[float] = deque()
        self._reader = FrameReader()
        self._out = bytearray()
        self._events: list[Event] = []

    # What it says to the board.

    def _ask(self, message: Any, now_s: float) -> None:
        self.trouble = None
        tries = VENT_TRIES if isinstance(message, m.Vent) else self._tries
        self._asked = Asked(message, self._next_seq(), now_s, now_s, tries)
        self._put(self._asked, now_s)

    def _put(self, asked: Asked, now_s: float) -> None:
        """Send what is asked, once more; a delimiter first ends whatever the line has half carried."""
        asked.left -= 1
        asked.again_s = now_s + (VENT_AGAIN_S if isinstance(asked.message, m.Vent) else self._reply_s)
        self._out += b"\0"
        self._send(asked.message, asked.seq)

    def _ping(self, now_s: float) -> None:
        host_us = int(now_s * 1e6) % TURN
        while len(self._pings) >= 64:
            self._pings.pop(next(iter(self._pings)))
        self._pings[host_us] = now_s
        self._send(m.Ping(host_us), self._next_seq())

    def _send(self, message: Any, seq: int) -> None:
        self.frames += 1
        self._out += frame(m.encode(message, seq))

    def _next_seq(self) -> int:
        """1 to 255: 0 is for what nobody asked."""
        self._seq = self._seq % 255 + 1
        return self._seq

    def _drop(self) -> None:
        self._asked = None
        self._out.clear()
        self._flying.clear()

    # How it moves.

    def _go(self, happens: str, why: str, now_s: float | None = None) -> bool:
        """Move by the table; a failure after the greeting, and a trip, are followed by a vent that waits for no answer."""
        was = self.state
        state = TRANSITIONS[happens].get(was)
        if state is None:
            return False
        self.state = state
        if state in (FAILED, VENTED):
            self._asked = None
            self._flying.clear()
            if was not in (GREETING, VENTING):
                self._drop()
                self._send(m.Vent(), self._next_seq())
        self._events.append(Moved(was, state, why))
        return True

    def _why(self, otherwise: str) -> str:
        """What the board itself has given as its reason, or these words where it has given none."""
        own = self.trouble is not None and self.trouble.code not in (m.NOT_ARMED, m.QUEUE_FULL)
        return self._say(self.trouble) if own else otherwise

    def _say(self, trouble: Trouble) -> str:
        where = "" if trouble.channel is None else f" on channel {trouble.channel}"
        return f"the board tells of a fault, {trouble.name}{where}" + (f": {trouble.text}" if trouble.text else "")

    def _hint(self) -> str:
        if self.echoes:
            return f"; the line sends back what it is sent ({self.echoes} frames)"
        garbled = self.unreadable + self._reader.rests
        if garbled:
            return f"; {garbled} frames could not be read: is the baud rate that of the board?"
        return ""

    def _take(self) -> list[Event]:
        events, self._events = self._events, []
        return events
