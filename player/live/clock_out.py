"""MIDI clock, sent at its moments: on a thread of its own, as a tick of the player is too coarse for it."""

import threading
from collections import deque
from collections.abc import Callable

from mido import Message

from player.engine.clock import Clock
from player.inputs.beat import Beat
from player.inputs.send_clock import ClockSender

AHEAD_S = 0.025
"""Messages are made ready so long before they are due, a few ticks of the player."""

LOOK_S = 0.002


class ClockOut:
    """The running score in, a clock out."""

    def __init__(self, clock: Clock, send: Callable[[Message], None]):
        self._clock, self._send = clock, send
        self._sender = ClockSender()
        self._until_s = clock.now()
        self._due: deque[tuple[float, Message]] = deque(maxlen=4096)
        self._ends = threading.Event()
        self._thread = threading.Thread(target=self._run, name="clock out", daemon=True)
        self._thread.start()

    def go(self, beat: Beat | None) -> None:
        """Once a tick: the running tempo now, None where nothing runs."""
        now = self._clock.now()
        from_s, self._until_s = max(now, self._until_s), max(now, self._until_s, now + AHEAD_S)
        if beat is None:
            self._due.extend(self._sender.until(None, now, now))
            self._until_s = now
        elif self._until_s > from_s:
            self._due.extend(self._sender.until(beat, from_s, self._until_s))

    def close(self) -> None:
        """Stop the receiver, and end."""
        self.go(None)
        self._ends.set()
        self._thread.join(timeout=1.0)

    def _run(self) -> None:
        while not self._ends.is_set() or self._due:
            if not self._due:
                self._ends.wait(LOOK_S)
                continue
            at_s, message = self._due.popleft()
            if message.type == "clock":
                if self._ends.is_set():
                    continue
                self._clock.wait_until(at_s)
            self._send(message)
