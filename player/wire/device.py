"""The device's side of the wire, with no I/O and no clock: bytes and times in, bytes and valve values out; see rules.py."""

from bisect import insort
from collections.abc import Callable, Sequence
from operator import itemgetter
from typing import Any

from player.wire import messages as m
from player.wire.frames import FrameReader, frame
from player.wire.rules import COUNTER, HALF, RAMP_STEP_US, REFUSALS, STATE_EVERY_US, TURN, Applied, Build, Changed, Event, Told
from player.wire.values import SHUT

__all__ = ["Applied", "Build", "Changed", "Device", "Told"]


class Device:
    """One valve driver. Times are µs that never go back, of any size; on the wire they wrap at 2^32.

    set_valves(first, values): called at once whenever channels take new values
    room: how many sets really wait at most, what the build says unless it is changed
    strain(first, count): called for what the channels' strains are, 0 to 65535; supply(): kPa gauge × 10
    """

    def __init__(
        self,
        build: Build,
        now_us: int,
        set_valves: Callable[[int, Sequence[int]], None],
        strain: Callable[[int, int], Sequence[int]] = lambda first, count: [0] * count,
        supply: Callable[[], int] = lambda: m.NOT_SENSED,
    ) -> None:
        self.build = build
        self.status = m.VENTED
        self.values = [0] * len(build.drives)
        self.late = 0
        self.room = build.queue
        self.channels = 0
        self.watchdog_us = 0
        self._set_valves, self._strain, self._supply = set_valves, strain, supply
        self._reader = FrameReader()
        self._echoes = 0
        self._greeted = False
        self._heard_us = now_us
        self._queue: list[tuple[int, int, Any]] = []
        self._ramp: tuple[int, int, list[int], int] | None = None
        self._state_us = now_us + STATE_EVERY_US
        self._out = bytearray()
        self._events: list[Event] = []
        self._does = {
            m.Hello: self._hello,
            m.Configure: self._configure,
            m.Arm: self._arm,
            m.Set: self._set,
            m.Vent: self._vent,
            m.Rest: self._rest,
            m.Ping: self._ping,
        }
        set_valves(0, self.values)

    # What the world does to it.

    def receive(self, data: bytes, now_us: int) -> list[Event]:
        """Bytes that came, in pieces of any size; first does what time has brought. Never raises, whatever comes."""
        self._bring(now_us)
        for payload in self._reader.frames(data):
            self._frame(payload, now_us)
        return self._take()

    def advance(self, now_us: int) -> list[Event]:
        """Do what time has brought: sets due, ramp, watchdog, state. Wanted at `next_us`; later is allowed."""
        self._bring(now_us)
        return self._take()

    def fail(self, code: int, channel: int, text: str, now_us: int) -> list[Event]:
        """A fault that the device itself has found (over-pressure, sensor): vents, says so, status 3."""
        self._bring(now_us)
        self._tell(code, channel, text, 0)
        self._exhaust(m.FAULT, m.FAULTS[code])
        self._say_state(now_us, 0)
        return self._take()

    def to_send(self) -> bytes:
        """The bytes for the host since the last call."""
        out = bytes(self._out)
        self._out.clear()
        return out

    def next_us(self) -> int:
        """The time at which `advance` next has something to do."""
        return min(self._next_us(), self._state_us)

    @property
    def bad(self) -> int:
        """Frames dropped since the start."""
        return self._reader.bad + self._echoes

    @property
    def queued(self) -> int:
        """Sets that wait."""
        return len(self._queue)

    @property
    def resting(self) -> bool:
        """Whether it is on its way to rest."""
        return self._ramp is not None

    # What time brings.

    def _next_us(self) -> int:
        """The next time of a set, a step of the ramp or the watchdog."""
        next_us = self._state_us
        if self._queue:
            next_us = min(next_us, self._queue[0][0])
        if self._ramp is not None:
            since, _, _, step = self._ramp
            next_us = min(next_us, since + (step + 1) * RAMP_STEP_US)
        if self.status == m.ARMED:
            next_us = min(next_us, self._heard_us + self.watchdog_us)
        return next_us

    def _bring(self, now_us: int) -> None:
        while True:
            trips_us = self._heard_us + self.watchdog_us if self.status == m.ARMED else now_us + 1
            if self._queue and self._queue[0][0] <= min(now_us, trips_us):
                due_us, arrival_us, message = self._queue.pop(0)
                self._apply(message, due_us, arrival_us, False)
                continue
            if self._ramp is not None:
                self._step(min(now_us, trips_us), now_us)
                if self._ramp is None:
                    continue
            if trips_us <= now_us:
                self._refuse("silence", 0)
                self._exhaust(m.VENTED, "watchdog")
                self._say_state(now_us, 0)
            break
        if now_us >= self._state_us:
            self._state_us += (now_us - self._state_us) // STATE_EVERY_US * STATE_EVERY_US + STATE_EVERY_US
            self._say_state(now_us, 0)
            if self.build.senses_strain and self.channels:
                self._say_sense(now_us)

    def _step(self, until_us: int, now_us: int) -> None:
        """The last step of the ramp that is due, and its end."""
        since_us, ramp_ms, start, done = self._ramp
        step = min((until_us - since_us) // RAMP_STEP_US, ramp_ms)
        if step > done:
            self._ramp = (since_us, ramp_ms, start, step)
            self._move(0, [value - value * step // ramp_ms for value in start])
        if step >= ramp_ms:
            self._exhaust(m.IDLE, "at rest")
            self._say_state(now_us, 0)

    # What frames bring.

    def _frame(self, payload: bytes, now_us: int) -> None:
        kind, seq = payload[0], payload[1]
        if kind >= 0x80:
            self._echoes += 1
            return
        try:
            message = m.decode(payload)
        except m.WrongForm:
            self._refuse("form", seq)
            return
        self._heard_us = now_us
        self._does[type(message)](message, seq, now_us)

    def _hello(self, message: Any, seq: int, now_us: int) -> None:
        self._exhaust(m.IDLE, "hello")
        self.channels = 0
        self._greeted = message.version == m.VERSION
        build = self.build
        flags = m.SENSES_STRAIN * build.senses_strain | m.SENSES_SUPPLY * build.senses_supply
        self._send(m.Board(m.VERSION, flags, len(build.drives), build.queue, now_us % TURN, build.name), seq)
        if not self._greeted:
            self._refuse("version", seq)
        self._say_state(now_us, seq)

    def _configure(self, message: Any, seq: int, now_us: int) -> None:
        if not self._greeted or self.status in (m.VENTED, m.FAULT):
            self._refuse("hello", seq)
        elif self.status == m.ARMED:
            self._refuse("armed", seq)
        elif not message.watchdog_ms:
            self._refuse("watchdog", seq)
        elif not 1 <= message.channels <= len(self.build.drives):
            self._refuse("channels", seq)
        elif self.build.rig not in (None, message.rig):
            self._refuse("rig", seq)
            self._exhaust(m.FAULT, "rig mismatch")
        else:
            self.channels, self.watchdog_us = message.channels, message.watchdog_ms * 1000
        self._say_state(now_us, seq)

    def _arm(self, message: Any, seq: int, now_us: int) -> None:
        if message.key != m.ARM_KEY:
            self._refuse("key", seq)
        elif self.status in (m.VENTED, m.FAULT):
            self._refuse("hello", seq)
        elif not self.channels:
            self._refuse("configure", seq)
        elif self._ramp is not None:
            self._refuse("resting", seq)
        else:
            self._become(m.ARMED, "arm")
        self._say_state(now_us, seq)

    def _set(self, message: Any, seq: int, now_us: int) -> None:
        count = len(message.value)
        if self.status != m.ARMED or self._ramp is not None:
            self._refuse("unarmed", seq)
        elif not count:
            self._refuse("empty", seq)
        elif message.first + count > self.channels:
            self._refuse("channel", seq, max(message.first, self.channels))
        else:
            ahead = (message.due_us - now_us + HALF) % TURN - HALF if message.due_us else 0
            if ahead <= 0:
                late = ahead < 0
                self.late = self.late + late & COUNTER
                self._apply(message, now_us + ahead if message.due_us else 0, now_us, late)
            elif len(self._queue) >= self.room:
                self._refuse("full", seq)
            else:
                insort(self._queue, (now_us + ahead, now_us, message), key=itemgetter(0))

    def _vent(self, message: Any, seq: int, now_us: int) -> None:
        self._exhaust(m.VENTED, "vent")
        self._say_state(now_us, seq)

    def _rest(self, message: Any, seq: int, now_us: int) -> None:
        if self.status == m.ARMED:
            self._queue.clear()
            start = [
                min(value, SHUT) if drive == "valve" else value
                for value, drive in zip(self.values, self.build.drives, strict=True)
            ]
            if message.ramp_ms:
                self._ramp = (now_us, message.ramp_ms, start, 0)
                self._move(0, start)
            else:
                self._exhaust(m.IDLE, "at rest")
        self._say_state(now_us, seq)

    def _ping(self, message: Any, seq: int, now_us: int) -> None:
        self._send(m.Pong(message.host_us, now_us % TURN), seq)

    # What it does.

    def _apply(self, message: Any, due_us: int, arrival_us: int, late: bool) -> None:
        self._move(message.first, message.value)
        self._events.append(Applied(arrival_us, due_us, message.first, len(message.value), late))

    def _move(self, first: int, values: Sequence[int]) -> None:
        self.values[first : first + len(values)] = values
        self._set_valves(first, values)

    def _exhaust(self, status: int, why: str) -> None:
        """Every channel to 0, the queue and the ramp dropped: before any word of it goes out."""
        self._move(0, [0] * len(self.values))
        self._queue.clear()
        self._ramp = None
        self._become(status, why)

    def _become(self, status: int, why: str) -> None:
        if status != self.status:
            self._events.append(Changed(self.status, status, why))
            self.status = status

    def _refuse(self, what: str, seq: int, channel: int = m.NO_CHANNEL) -> None:
        code, text = REFUSALS[what]
        self._tell(code, channel, text, seq)

    def _tell(self, code: int, channel: int, text: str, seq: int) -> None:
        self._events.append(Told(code, channel, text))
        self._send(m.Faulted(code, channel, text), seq)

    def _say_state(self, now_us: int, seq: int) -> None:
        supply = self._supply() if self.build.senses_supply else m.NOT_SENSED
        self._send(m.State(now_us % TURN, self.status, self.queued, self.late, self.bad & COUNTER, supply), seq)

    def _say_sense(self, now_us: int) -> None:
        for first in range(0, self.channels, m.VALUES_LIMIT):
            count = min(m.VALUES_LIMIT, self.channels - first)
            self._send(m.Sense(now_us % TURN, first, tuple(self._strain(first, count))), 0)

    def _send(self, message: Any, seq: int) -> None:
        self._out += frame(m.encode(message, seq))

    def _take(self) -> list[Event]:
        events, self._events = self._events, []
        return events
