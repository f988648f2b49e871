"""A host on the terminal of a simulated board in C."""

import select
import time

from player.outputs.serial_line import SerialLine
from player.wire import messages as m
from player.wire.frames import FrameReader, frame

PATIENCE_S = 20.0
"""A busy machine may be slow: nothing here is measured by it."""


class Talk:
    """A host that says one message at a time."""

    def __init__(self, path):
        self.line = SerialLine(path, 2_000_000)
        self.line.open()
        self.reader, self.heard, self.seq = FrameReader(), [], 0
        self.raw = bytearray()

    def say(self, message):
        self.seq = self.seq % 255 + 1
        self.line.write(frame(m.encode(message, self.seq)))
        return self.seq

    def listen(self, seconds):
        end = time.monotonic() + seconds
        while (left := end - time.monotonic()) > 0:
            select.select([self.line], [], [], min(left, 0.05))
            # What the terminal had no room for goes on.
            self.line.write(b"")
            data = self.line.read()
            self.raw += data
            self.heard += [(payload[1], m.decode(payload)) for payload in self.reader.feed(data)]

    def until(self, wanted, told=""):
        """Listen until something heard is as wanted; returns it."""
        end, seen = time.monotonic() + PATIENCE_S, 0
        while time.monotonic() < end:
            for seq, message in self.heard[seen:]:
                seen += 1
                if wanted(seq, message):
                    return message
            self.listen(0.01)
        raise AssertionError(f"{told or wanted} was never heard; last: {self.heard[-3:]}")

    def ask(self, message, kind=m.State):
        seq = self.say(message)
        return self.until(lambda s, answer: s == seq and isinstance(answer, kind), message)

    def armed(self, channels=4, watchdog_ms=60_000):
        self.board = self.ask(m.Hello(1), m.Board)
        self.ask(m.Configure(channels, watchdog_ms, 0x1234ABCD))
        assert self.ask(m.Arm(m.ARM_KEY)).status == m.ARMED
        return self

    def fault(self, code):
        return self.until(lambda _, said: isinstance(said, m.Faulted) and said.code == code, f"fault {code}")

    def state(self, status):
        return self.until(lambda _, said: isinstance(said, m.State) and said.status == status, m.STATUSES[status])

    def forget(self):
        """What was heard so far; what comes is new."""
        self.listen(0.1)
        self.heard.clear()
        return self
