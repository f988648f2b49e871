"""A host and a device on a line in virtual time, and boards that answer otherwise, for the tests of the host."""

from random import Random

from player.wire import link
from player.wire import messages as m
from player.wire.device import Build, Device
from player.wire.frames import FrameReader, frame
from player.wire.host import Host

RIG = 0x1234ABCD


class Line:
    """A host and a device joined by a line in virtual time, which may delay, lose or change bytes."""

    def __init__(self, *, channels=4, delay_s=0.0005, jitter_s=0.0, spoil=None, seed=1, device=None, tick_s=0.001, **host):
        self.chance = Random(seed)
        self.delay_s, self.jitter_s, self.spoil, self.tick_s = delay_s, jitter_s, spoil, tick_s
        self.now = 10.0
        self.host = Host(channels, RIG, **host)
        self.moved = []
        self.device = device or self.new_device(channels)
        self.there, self.back = [], []
        self.events = []
        self.device_events = []
        self.cut = False

    def new_device(self, channels=4, rig=RIG, drives=None):
        build = Build("Bench", drives or ("strain",) * channels, rig=rig, senses_strain=True, senses_supply=True)
        return Device(
            build, self.us(), lambda first, values: self.moved.append((self.now, first, list(values))), supply=lambda: 6000
        )

    def us(self):
        return round(self.now * 1e6)

    def run(self, seconds, until=None):
        end = self.now + seconds
        while self.now < end:
            self.now += self.tick_s
            self._carry(self.there, self.host.to_send())
            data = self._arrived(self.there)
            if data:
                self.device_events += self.device.receive(data, self.us())
            self.device_events += self.device.advance(self.us())
            self._carry(self.back, self.device.to_send())
            self.events += self.host.receive(self._arrived(self.back), self.now)
            self.events += self.host.tick(self.now)
            if until and self.host.state in until:
                return self
        return self

    def _carry(self, way, data):
        if not data or self.cut:
            return
        if self.spoil:
            data = self.spoil(data, self.chance)
        at = self.now + self.delay_s + self.chance.random() * self.jitter_s
        way.append((max(at, way[-1][0] if way else 0.0), data))

    def _arrived(self, way):
        data = b""
        while way and way[0][0] <= self.now:
            data += way.pop(0)[1]
        return data

    def ready(self):
        self.host.open(self.now)
        return self.run(30.0, {"ready", "failed"})

    def armed(self):
        self.ready()
        assert self.host.arm(self.now)
        return self.run(10.0, {"armed", "failed"})

    def why(self):
        """Why the link last changed its state."""
        return [event.why for event in self.events if isinstance(event, link.Moved)][-1]

    def states(self):
        return [event.now for event in self.events if isinstance(event, link.Moved)]


class Stranger:
    """A board written by someone else, who has read the page and no more: answers by a script."""

    def __init__(self, answers, unasked=()):
        self.answers, self.unasked = answers, list(unasked)
        self.reader, self.out, self.asked = FrameReader(), b"", []

    def receive(self, data, now_us):
        for payload in self.reader.feed(data):
            message = m.decode(payload)
            self.asked.append(message)
            self.say(*((payload[1] if seq is None else seq, answer) for seq, answer in self.answers(message, now_us)))
        return []

    def advance(self, now_us):
        if self.unasked and now_us >= self.unasked[0][0]:
            self.say((0, self.unasked.pop(0)[1]))
        return []

    def say(self, *frames):
        for seq, message in frames:
            self.out += message if isinstance(message, bytes) else frame(m.encode(message, seq))

    def to_send(self):
        out, self.out = self.out, b""
        return out


def flip(share):
    return lambda data, chance: bytes(b ^ chance.randrange(1, 256) if chance.random() < share else b for b in data)


def lose(share):
    return lambda data, chance: bytes(b for b in data if chance.random() >= share)


def stranger(message, now_us, *, after_arm=m.ARMED):
    """As the page asks, by someone who answers hello after state, stays vented until armed, and repeats itself."""
    us = now_us % (1 << 32)
    status = {m.Arm: after_arm, m.Rest: m.IDLE}.get(type(message), m.VENTED)
    state = m.State(us, status, 0, 900, 800, m.NOT_SENSED)
    if isinstance(message, m.Hello):
        return [(0, b"boot v3\r\n\0\xff\xff\0"), (None, m.Board(1, 0, 8, 64, us, "Own \u2713")), (None, state), (None, state)]
    if isinstance(message, m.Ping):
        return [(0, m.Pong(message.host_us, us)), (None, m.Pong(message.host_us, us)), (0, m.Pong(1, us))]
    return [(None, state)] if not isinstance(message, m.Set) else []
