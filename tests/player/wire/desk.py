"""A device in virtual time, for the tests of what it does."""

from player.wire import messages as m
from player.wire.device import Build, Device
from player.wire.frames import FrameReader, frame
from player.wire.rules import REFUSALS

WATCHDOG_MS = 200
RIG = 0x1234ABCD


class Desk:
    """A device in virtual time, with what it has sent and moved."""

    def __init__(self, drives=("strain",) * 4, rig=RIG, now=0, **build):
        self.now = now
        self.moved = []
        self.reader = FrameReader()
        self.device = Device(
            Build("Bench", drives, rig=rig, **build), now, lambda first, values: self.moved.append((first, list(values)))
        )
        self.events = []

    def _move(self, first, values):
        self.moved.append((first, list(values)))

    def say(self, message, seq=9, at=None):
        """Say one message at a time; returns the answers to it, with their seq."""
        return [answer for answer in self.bytes(frame(m.encode(message, seq)), at) if answer[0] == seq]

    def bytes(self, data, at=None):
        self.now = self.now if at is None else at
        self.events += self.device.receive(data, self.now)
        return self.heard()

    def wait(self, until):
        """Let time pass as a timer would; returns all that was sent unasked."""
        while self.device.next_us() <= until:
            self.now = max(self.now, self.device.next_us())
            self.events += self.device.advance(self.now)
        self.now = until
        self.events += self.device.advance(until)
        return [answer for seq, answer in self.heard() if seq == 0]

    def heard(self):
        return [(payload[1], m.decode(payload)) for payload in self.reader.feed(self.device.to_send())]

    def state(self):
        return self.device.status

    def armed(self):
        self.say(m.Hello(1))
        self.say(m.Configure(len(self.device.values), WATCHDOG_MS, RIG))
        self.say(m.Arm(m.ARM_KEY))
        assert self.state() == m.ARMED
        return self


def refusal(name, channel=m.NO_CHANNEL):
    code, text = REFUSALS[name]
    return m.Faulted(code, channel, text)


def faults(answers):
    return [answer for _, answer in answers if isinstance(answer, m.Faulted)]
