"""The host's side of the wire, with no I/O and no clock: bytes and times in, events and bytes out; its rules are in link.py."""

from collections.abc import Sequence
from typing import Any

from player.wire import messages as m
from player.wire.clock import HALF, TURN
from player.wire.line import highest_rate, line_load, set_frames
from player.wire.link import (
    ARMED,
    ARMING,
    CONFIGURING,
    FAILED,
    GREETING,
    READY,
    RESTING,
    SHUT,
    VENTED,
    VENTING,
    Back,
    Event,
    Sensed,
    Silent,
    Trouble,
)
from player.wire.talk import Talk

__all__ = ["RAMP_LIMIT_S", "Host", "highest_rate", "line_load"]

RAMP_LIMIT_S = 65.535
"""The longest ramp to rest that the wire can say."""
RESTING_SPARE_S = 1.0
ANEW_US = 50_000


class Host(Talk):
    """One line to one board; what it is made of and what it shows is said at `Talk`."""

    # Deeds.

    def open(self, now_s: float) -> None:
        """Greet the board, whatever was before."""
        self._out.clear()
        self._flying.clear()
        self._pings.clear()
        # A board that went on talking to nobody is heard from the midst of a frame on.
        self._reader.begin_amid()
        self.clock.forget()
        self.board = self.status = self.trouble = self._base = self._newest_us = None
        self.heard_s, self._silent, self._next_ping_s = now_s, False, now_s
        self._go("open", "greeting the board")
        self._ask(m.Hello(m.VERSION), now_s)

    def arm(self, now_s: float) -> bool:
        """Ask a ready board to arm; False where it is not ready."""
        if not self._go("arm", "arming"):
            return False
        self._ask(m.Arm(m.ARM_KEY), now_s)
        return True

    def rest(self, ramp_s: float, now_s: float) -> bool:
        """Bring all to rest over a time, then disarm; False where the board is not armed. Sets not yet sent are dropped.

        A time beyond RAMP_LIMIT_S becomes that; the event says the time that it will take.
        """
        ramp_ms = round(min(RAMP_LIMIT_S, max(0.0, ramp_s)) * 1000.0)
        if not self._go("rest", f"coming to rest in {ramp_ms / 1000.0:.3g} s"):
            return False
        self._ramp_end_s = now_s + ramp_ms / 1000.0
        self._drop()
        self._ask(m.Rest(ramp_ms), now_s)
        return True

    def vent(self, now_s: float, why: str = "vent") -> bool:
        """Exhaust everything now, ahead of all that is not yet sent; False where no board was ever greeted."""
        if not self._go("vent", why):
            return False
        self._drop()
        self._ask(m.Vent(), now_s)
        return True

    def set(self, due_s: float, first: int, values: Sequence[int], now_s: float) -> bool:
        """Send values of channels from `first` on, due at a time of the host; False, and counted, where nothing was sent.

        That is so while not armed, and where the board's queue has no room for all of its frames.
        """
        if self.state != ARMED or self.room(now_s) < set_frames(len(values)) or not self.clock.known:
            self.skipped += 1
            return False
        due_us = self.clock.due_us(due_s)
        for start in range(0, len(values), m.VALUES_LIMIT):
            piece = values[start : start + m.VALUES_LIMIT]
            self._send(m.Set(due_us, first + start, tuple(piece)), self._next_seq())
            self._flying.append(due_s)
        return True

    def room(self, now_s: float) -> int:
        """How many more sets the board's queue takes now, by what was sent and is not yet due."""
        spare_s = min(self.clock.bound_us(now_s), 5e3) * 1e-6
        while self._flying and self._flying[0] + spare_s < now_s:
            self._flying.popleft()
        return self.board.queue - len(self._flying) if self.board else 0

    # Time and bytes.

    def receive(self, data: bytes, now_s: float) -> list[Event]:
        """Bytes from the board, in pieces of any size. Never raises, whatever comes."""
        for payload in self._reader.feed(data):
            if payload[0] in m.TO_DEVICE:
                self.echoes += 1
                continue
            try:
                message = m.decode(payload)
            except m.WrongForm:
                self.unknown += 1
                continue
            self._hear(now_s)
            _DOES[type(message)](self, message, payload[1], now_s)
        return self._take()

    def tick(self, now_s: float) -> list[Event]:
        """Do what time asks for: ask again, ping, notice silence. Wanted at `next_s`; more often does no harm."""
        asked = self._asked
        if asked and now_s >= asked.again_s:
            if asked.left <= 0:
                self._asked = None
                name = m.spec_of(asked.message).name
                self._go("unanswered", f"no answer to {name} in {now_s - asked.first_s:.1f} s" + self._hint(), now_s)
            else:
                if isinstance(asked.message, m.Rest):
                    left_ms = max(0, round((self._ramp_end_s - now_s) * 1000.0))
                    asked.message = m.Rest(min(left_ms, asked.message.ramp_ms))
                self._put(asked, now_s)
        if self.state == RESTING and now_s >= self._ramp_end_s + RESTING_SPARE_S:
            self.vent(now_s, "the board has not come to rest in its time")
        if self.state not in (SHUT, FAILED) and now_s >= self._next_ping_s:
            self._next_ping_s = max(self._next_ping_s + self._ping_s, now_s + 0.5 * self._ping_s)
            self._ping(now_s)
        if self.state not in (SHUT, GREETING, FAILED) and not self._silent and now_s - self.heard_s > self._silence_s:
            self._silent = True
            self._events.append(Silent(self.heard_s))
        return self._take()

    def next_s(self) -> float:
        """When `tick` next has something to do."""
        times = [self._next_ping_s]
        if self._asked:
            times.append(self._asked.again_s)
        if not self._silent and self.heard_s is not None:
            times.append(self.heard_s + self._silence_s)
        return min(times)

    def to_send(self) -> bytes:
        """The bytes for the board since the last call."""
        out = bytes(self._out)
        self._out.clear()
        return out

    @property
    def unreadable(self) -> int:
        """Frames from the board that could not be read, and messages that version 1 does not know."""
        return self._reader.bad + self.unknown

    # What the board says.

    def _hear(self, now_s: float) -> None:
        self.frames += 1
        if self._silent:
            self._events.append(Back(now_s - self.heard_s))
        self.heard_s, self._silent = now_s, False

    def _met(self, message: Any, seq: int, now_s: float) -> None:
        if self.state == GREETING:
            self.board = message
        elif self._newest_us is not None and _ahead(message.device_us, self._newest_us) < -ANEW_US:
            self._go("anew", "the board has started anew", now_s)

    def _told(self, message: Any, seq: int, now_s: float) -> None:
        channel = None if message.channel == m.NO_CHANNEL else message.channel
        self.trouble = trouble = Trouble(message.code, channel, message.text, seq)
        self._events.append(trouble)
        asked = self._asked
        refuses = asked is not None and seq == asked.seq and not isinstance(asked.message, m.Rest | m.Vent)
        if refuses or message.code == m.RIG_MISMATCH:
            self._go("refused", self._say(trouble), now_s)
        elif message.code == m.WATCHDOG:
            self._go("tripped", self._say(trouble), now_s)

    def _stated(self, message: Any, seq: int, now_s: float) -> None:
        answers = self._asked is not None and seq == self._asked.seq and seq != 0
        if not answers and self._newest_us is not None and _ahead(message.device_us, self._newest_us) < 0:
            # Older than what is known, from a board that speaks with two tongues: says nothing of now.
            return
        self._newest_us = message.device_us
        self.status, self.queued = message.status, message.queued
        self.supply_kPa = None if message.supply == m.NOT_SENSED else message.supply / 10.0
        if self._base is None:
            self._base = message.late, message.bad
        self.late, self.bad = (message.late - self._base[0]) % TURN, (message.bad - self._base[1]) % TURN
        _MEANS.get(self.state, Host._idles)(self, message, answers, now_s)

    def _greets(self, message: Any, answers: bool, now_s: float) -> None:
        if not answers or self.board is None:
            return
        if self.board.version != m.VERSION:
            self._go("refused", f"the board speaks version {self.board.version}, expected {m.VERSION}", now_s)
        elif self.board.channels < self.channels:
            self._go("refused", f"the board has {self.board.channels} channels, the rig wants {self.channels}", now_s)
        else:
            # What the board counted before is not this run's; a hello asked again may have been dropped.
            self._base = message.late, message.bad
            self._go("greeted", f"{self.board.name or 'the board'} answers")
            self._ask(m.Configure(self.channels, self.watchdog_ms, self.rig), now_s)

    def _configures(self, message: Any, answers: bool, now_s: float) -> None:
        if answers:
            self._asked = None
            if message.status == m.FAULT:
                self._go("faulted", self._why("the board is in fault"), now_s)
            else:
                self._go("configured", "ready to arm")

    def _arms(self, message: Any, answers: bool, now_s: float) -> None:
        if message.status == m.ARMED:
            self._asked = None
            self._go("armed", "armed")
        elif answers:
            self._go("refused", self._why(f"asked to arm, the board says {_status(message.status)}"), now_s)

    def _runs(self, message: Any, answers: bool, now_s: float) -> None:
        if message.status == m.VENTED:
            self._go("tripped", self._why("the board has vented"), now_s)
        elif message.status == m.IDLE:
            self._go("disarmed", "the board has disarmed by itself", now_s)
        else:
            self._idles(message, answers, now_s)

    def _rests(self, message: Any, answers: bool, now_s: float) -> None:
        if answers:
            self._asked = None
        if message.status == m.IDLE:
            self._asked = None
            self._go("rested", "at rest")
        elif message.status != m.ARMED:
            self._runs(message, answers, now_s)

    def _vents(self, message: Any, answers: bool, now_s: float) -> None:
        if answers or message.status == m.VENTED:
            self._asked = None
            self._go("vented", "vented")

    def _idles(self, message: Any, answers: bool, now_s: float) -> None:
        if message.status == m.FAULT:
            self._go("faulted", self._why("the board is in fault"), now_s)
        elif message.status == m.ARMED and self.state in (VENTED, FAILED, READY):
            self._send(m.Vent(), self._next_seq())

    def _ponged(self, message: Any, seq: int, now_s: float) -> None:
        sent_s = self._pings.pop(message.host_us, None)
        if sent_s is not None and not self.clock.heard(sent_s, now_s, message.device_us):
            self._go("anew", "the board's clock has jumped: it has started anew, or cannot be relied on", now_s)

    def _sensed(self, message: Any, seq: int, now_s: float) -> None:
        at_s = self.clock.host_s(message.device_us) if self.clock.known else now_s
        self._events.append(Sensed(at_s, message.first, message.strain))


_DOES: dict[type, Any] = {
    m.Board: Host._met,
    m.State: Host._stated,
    m.Sense: Host._sensed,
    m.Faulted: Host._told,
    m.Pong: Host._ponged,
}
_MEANS: dict[str, Any] = {
    GREETING: Host._greets,
    CONFIGURING: Host._configures,
    ARMING: Host._arms,
    ARMED: Host._runs,
    RESTING: Host._rests,
    VENTING: Host._vents,
}
"""What a state frame means to each state of the link."""


def _ahead(one_us: int, other_us: int) -> int:
    """How far one reading of a wrapping clock is ahead of another."""
    return (one_us - other_us + HALF) % TURN - HALF


def _status(status: int) -> str:
    return m.STATUSES[status] if status < len(m.STATUSES) else f"status {status}"
