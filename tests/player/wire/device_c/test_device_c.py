"""The device in C against the one in Python: the same script to both, and all that they do compared byte by byte."""

import re
import struct
import subprocess
from collections import Counter
from pathlib import Path
from random import Random

import pytest

from player.wire import messages as m
from player.wire.device import Applied, Build, Changed, Device
from player.wire.frames import ENCODED_LIMIT, frame, stuff
from player.wire.rules import REFUSALS, TURN
from player.wire.values import DRIVES

SOURCES = Path(m.__file__).parent / "device_c"
CHANNELS = 1100
LONGEST_STEP_US = TURN - 2_000_000
"""A device in C tells any two of its times apart that are less than a turn of its clock apart, but for a second."""


def strain(first, count):
    return [channel * 257 % 65536 for channel in range(first, first + count)]


class Recorded(Device):
    """Writes down valves and frames in the order in which they happen."""

    def __init__(self, build, now_us):
        self.record = bytearray()
        super().__init__(build, now_us, self._valves, strain, lambda: 4321)

    def _valves(self, first, values):
        for channel, value in enumerate(values, first):
            self.record += struct.pack("<BHH", 86, channel, value)

    def _send(self, message, seq):
        sent = frame(m.encode(message, seq))
        self.record += b"S" + len(sent).to_bytes(2, "little") + sent


def letters(text):
    return bytes((len(text),)) + text.encode()


def written(device, events, now):
    """What the driver writes after an input."""
    out = bytearray(device.record)
    device.record.clear()
    for event in events:
        if isinstance(event, Applied):
            numbers = (event.arrival_us % TURN, event.due_us % TURN, event.first, event.count, event.late)
            out += b"A" + struct.pack("<IIHHB", *numbers)
        elif isinstance(event, Changed):
            out += struct.pack("<BBB", 67, event.was, event.now) + letters(event.why)
        else:
            out += struct.pack("<BBH", 84, event.code, event.channel) + letters(event.text)
    wait = max(device.next_us() - now, 0)
    return out + struct.pack("<BBHIII", 78, device.status, device.queued, device.late, device.bad % TURN, wait)


class Play:
    """Random conversations, held with the device in Python as they are made up.

    script: for the driver; expected: what the driver is to write; marks: where each input begins in both, and what it was
    """

    def __init__(self, seed):
        self.chance = Random(seed)
        self.script, self.expected = bytearray(), bytearray()
        self.marks = []
        self.seen = Counter()

    def more(self, inputs):
        """Conversations of so many inputs in all."""
        while inputs > 0:
            self._begin()
            for _ in range(min(self.chance.randrange(20, 400), inputs)):
                self._input()
                inputs -= 1
        return self

    def compare(self, did):
        """Nothing if the driver did the same; where it differs, says at which input."""
        if did == self.expected:
            return
        at = next((n for n, (a, b) in enumerate(zip(did, self.expected, strict=False)) if a != b), len(did))
        here = max(n for n, (_, out, _) in enumerate(self.marks) if out <= at)
        begin, end = self.marks[here][1], self.marks[here + 1][1] if here + 1 < len(self.marks) else None
        raise AssertionError(
            f"input {here}, {self.marks[here][2]}: Python {bytes(self.expected[begin:end]).hex(' ')}, "
            f"C {did[begin : None if end is None else end + 40].hex(' ')}"
        )

    def _mark(self, what):
        self.marks.append((len(self.script), len(self.expected), what))

    def _begin(self):
        chance = self.chance
        channels = CHANNELS if chance.random() < 0.005 else chance.randrange(1, 7)
        knows = chance.random() < 0.5
        self.rig = chance.choice((7, 0xDEADBEEF))
        drives = tuple(chance.choice(DRIVES) for _ in range(channels))
        senses = chance.randrange(4)
        name = "".join(chance.choice("abé~ ") for _ in range(chance.choice((0, 3, 120))))
        room = 64 if chance.random() < 0.7 else chance.randrange(1, 65)
        self.now = chance.choice((0, chance.randrange(TURN), TURN - chance.randrange(3_000_000), TURN // 2 - 1000))
        self._mark("start")
        self.script += struct.pack("<BIHBBIH", 0, self.now, channels, senses, knows, self.rig, room)
        self.script += bytes(DRIVES.index(drive) for drive in drives) + letters(name)[:1]
        self.script[-1] = len(name.encode())
        self.script += name.encode()
        build = Build(name, drives, 64, bool(senses & 1), bool(senses & 2), self.rig if knows else None)
        self.device = Recorded(build, self.now)
        self.device.room = room
        self.channels = channels
        self.expected += written(self.device, [], self.now)
        self.left, self.flood = b"", 0
        # Many a conversation begins as it should, so that armed devices are met often.
        self.todo = [m.Hello(1), self._configure(True), m.Arm(m.ARM_KEY)] if chance.random() < 0.8 else []

    def _input(self):
        chance, device = self.chance, self.device
        self._pass_time()
        kind = chance.random()
        self.seen["status", device.status, device.resting] += 1
        head = struct.pack("<I", self.now % TURN)
        if kind < 0.2:
            self._mark(f"advance to {self.now}")
            self.script += b"\2" + head
            events = device.advance(self.now)
        elif kind < 0.205:
            code, channel, text = (
                chance.choice((m.OVER_PRESSURE, m.SENSOR)),
                chance.randrange(65536),
                chance.choice(("", "hot")),
            )
            self._mark(f"fails at {self.now}")
            self.script += b"\3" + head + struct.pack("<BH", code, channel) + letters(text)
            events = device.fail(code, channel, text, self.now)
        else:
            data = self._bytes()
            self._mark(f"at {self.now} {data.hex(' ')}")
            self.script += b"\1" + head + len(data).to_bytes(2, "little") + data
            events = device.receive(data, self.now)
        self.seen.update(getattr(event, "text", type(event).__name__) for event in events)
        self.seen["queued"] = max(self.seen["queued"], device.queued)
        self.expected += written(device, events, self.now)

    def _pass_time(self):
        chance, kind = self.chance, self.chance.random()
        if kind < 0.35 or self.flood > 1:
            step = 0
        elif kind < 0.65:
            step = chance.randrange(3000)
        elif kind < 0.85:
            # To the very time of what comes next, or one beside it.
            step = max(self.device.next_us() - self.now + chance.randrange(-1, 2), 0)
        elif kind < 0.985:
            step = chance.randrange(60_000)
        elif kind < 0.998:
            step = chance.randrange(2_000_000)
        else:
            step = chance.randrange(LONGEST_STEP_US)
        self.now += step

    def _configure(self, good):
        chance = self.chance
        if good:
            return m.Configure(chance.randrange(1, self.channels + 1), chance.choice((5, 60, 1000, 65535)), self.rig)
        return m.Configure(chance.randrange(self.channels + 3), chance.choice((0, 1, 500)), chance.choice((self.rig, 0)))

    def _message(self):
        chance = self.chance
        if self.todo:
            return self.todo.pop(0)
        kind = chance.random()
        if kind < 0.62:
            ahead = chance.choice(
                (0, 1, 1000, 2000, 2000, 10_000, chance.randrange(200_000), -1, -chance.randrange(1, 1 << 31))
            )
            due = 0 if chance.random() < 0.03 else (self.now + ahead) % TURN
            usable = self.device.channels or self.channels
            first = chance.randrange(usable + (chance.random() < 0.1))
            most = max(min(usable - first, 1020), 1)
            count = 0 if chance.random() < 0.02 else chance.randrange(1, most + 1) + (chance.random() < 0.03) * (most < 1018)
            if chance.random() < 0.01:
                first, count = chance.randrange(65536), chance.randrange(3)
            return m.Set(due, first, tuple(chance.choice((0, 1, 32768, 65535, 300)) for _ in range(count)))
        if kind < 0.72:
            return m.Ping(chance.randrange(TURN))
        if kind < 0.75:
            return m.Rest(chance.choice((0, 1, 7, 300, 65535)))
        if kind < 0.77:
            return m.Vent()
        if kind < 0.80:
            return m.Hello(chance.choice((1, 1, 1, 0, 2)))
        if kind < 0.85:
            self.todo = [self._configure(True), m.Arm(m.ARM_KEY)]
            return m.Hello(1)
        if kind < 0.95:
            return self._configure(chance.random() < 0.5)
        return m.Arm(m.ARM_KEY if chance.random() < 0.8 else chance.randrange(TURN))

    def _frame(self):
        chance = self.chance
        payload = m.encode(self._message(), chance.randrange(256))
        kind = chance.random()
        if kind < 0.90:
            return frame(payload)
        if kind < 0.93:
            # A good frame whose message is no message, or somebody else's.
            if chance.random() < 0.5:
                return frame(bytes((chance.choice((0, 8, 0x7F, 0x80, 0x82, 0xFF, chance.randrange(256))),)) + payload[1:])
            return frame(payload[: chance.randrange(2, len(payload) + 1)] + chance.randbytes(chance.randrange(3)))
        if kind < 0.95:
            stuffed = bytearray(frame(payload))
            stuffed[chance.randrange(len(stuffed))] ^= chance.randrange(1, 256)
            return bytes(stuffed)
        if kind < 0.96:
            return frame(payload)[: chance.randrange(len(payload))] + chance.choice((b"", b"\0"))
        if kind < 0.97:
            return b"\0" * chance.randrange(1, 4)
        if kind < 0.98:
            # Sound stuffing around anything, short ones too.
            return stuff(chance.randbytes(chance.randrange(6))) + b"\0"
        if kind < 0.983:
            length = chance.choice((ENCODED_LIMIT - 1, ENCODED_LIMIT, ENCODED_LIMIT + 1, ENCODED_LIMIT + 700))
            return bytes(chance.randrange(1, 256) for _ in range(length)) + b"\0"
        if kind < 0.986:
            body = chance.randbytes(chance.choice((2047, 2048, 2049, 2056)))
            return frame(payload[:2] + body)
        return chance.randbytes(chance.randrange(40))

    def _bytes(self):
        chance = self.chance
        if self.left and chance.random() < 0.9:
            cut = chance.randrange(1, len(self.left) + 1)
            data, self.left = self.left[:cut], self.left[cut:]
            return data
        self.flood -= self.flood > 0
        if self.flood:
            # Sets that all wait for long: the queue fills.
            return frame(m.encode(m.Set((self.now + 150_000 + chance.randrange(9)) % TURN, 0, (self.flood,)), 5))
        if self.device.status == m.ARMED and chance.random() < 0.01:
            self.flood = 75
        data = b"".join(self._frame() for _ in range(1 if chance.random() < 0.9 else chance.randrange(2, 90)))
        if chance.random() < 0.1:
            cut = chance.randrange(len(data) + 1)
            data, self.left = data[:cut], data[cut:]
        return data[:65535]


@pytest.mark.parametrize("seed", range(4))
def test_it_does_what_the_device_in_python_does_whatever_comes(driver, seed):
    play = Play(seed).more(12_500)
    play.compare(driver(bytes(play.script)))


def test_the_conversations_held_with_both_reach_every_state_every_refusal_and_a_full_queue():
    seen = Play(99).more(12_500).seen
    assert {text for _, text in REFUSALS.values()} <= set(seen)
    assert {("status", status, False) for status in range(4)} | {("status", m.ARMED, True)} <= set(seen)
    assert seen["queued"] == 64
    assert min(seen["Applied"], seen["Changed"]) > 100


@pytest.mark.soak
@pytest.mark.timeout(3600)
@pytest.mark.parametrize("seed", range(1000, 1010))
def test_it_does_what_the_device_in_python_does_over_millions_of_inputs(driver, seed):
    for part in range(10):
        play = Play(100 * seed + part).more(25_000)
        play.compare(driver(bytes(play.script)))


def test_a_difference_between_the_two_would_be_seen():
    play = Play(1).more(300)
    wrong = bytearray(play.expected)
    wrong[len(wrong) // 2] ^= 1
    with pytest.raises(AssertionError, match=r"input [0-9]+, .*: Python .*, C "):
        play.compare(bytes(wrong))


def test_a_clock_that_goes_back_by_less_than_a_second_stands_still(driver):
    begin = struct.pack("<BIHBBIH", 0, 5_000_000, 1, 0, 0, 0, 64) + b"\0" + b"\0"
    script = begin + b"\2" + struct.pack("<I", 5_010_000) + b"\2" + struct.pack("<I", 4_500_000)
    back = driver(script + b"\2" + struct.pack("<I", 5_020_000))[5:]
    waits = [struct.unpack("<BBHIII", part)[-1] for part in (back[n : n + 16] for n in range(0, len(back), 16))]
    assert waits == [50_000, 40_000, 40_000, 30_000]


def test_it_asks_for_no_memory_and_no_operating_system(compiler, tmp_path):
    """What the two files want from elsewhere is copying and clearing memory, and the length of a text."""
    wanted = set()
    for name in ("device", "frames"):
        made = tmp_path / f"{name}.o"
        call = [compiler, "-std=c99", "-O2", "-fno-stack-protector", "-c", str(SOURCES / f"{name}.c"), "-o", str(made)]
        subprocess.run(call, check=True, timeout=60)
        listed = subprocess.run(["nm", "-u", str(made)], check=True, capture_output=True, text=True, timeout=60).stdout
        wanted |= {line.split()[-1] for line in listed.splitlines()}
    # A GOT is the loader's of a machine with an operating system, not the program's wish.
    wanted = {name for name in wanted if not name.startswith("dc_")} - {"_GLOBAL_OFFSET_TABLE_"}
    assert wanted <= {"memset", "memmove", "memcpy", "strlen"}


def test_it_is_under_a_thousand_lines():
    sources = [*SOURCES.glob("*.c"), *SOURCES.glob("*.h")]
    assert {source.name for source in sources} == {"device.h", "device.c", "frames.h", "frames.c"}
    assert sum(len(source.read_text().splitlines()) for source in sources) < 1000


def test_its_texts_are_those_of_the_rules():
    """Each refusal stands in the C source as it stands in the table, with its code."""
    names = ["", *(f"DC_{name.upper().replace(' ', '_').replace('-', '_')}" for name in m.FAULTS.values())]
    found = re.findall(r'\{(DC_[A-Z_]+), "([^"]+)"\}', (SOURCES / "device.c").read_text())
    assert sorted((names.index(code), text) for code, text in found) == sorted(REFUSALS.values())


@pytest.mark.parametrize("wrong", ["-DDC_QUEUE=63", "-DDC_CHANNELS=0", "-DDC_CHANNELS=65536"])
def test_sizes_that_the_protocol_cannot_say_do_not_compile(compiler, tmp_path, wrong):
    call = [compiler, "-std=c99", "-c", wrong, str(SOURCES / "device.c"), "-o", str(tmp_path / "never.o")]
    done = subprocess.run(call, capture_output=True, text=True, timeout=60)
    assert done.returncode != 0
    assert "1 to 65535 channels and room for 64" in done.stderr
