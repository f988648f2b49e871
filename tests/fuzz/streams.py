"""What comes over lines while a run goes on, as targets: MIDI, OSC, both ends of the wire, front ends at the door."""

import json
import socket
import struct
from collections.abc import Callable, Sequence
from contextlib import suppress
from functools import cache
from pathlib import Path
from random import Random

from mido import Message
from pythonosc.osc_bundle_builder import OscBundleBuilder
from pythonosc.osc_message import OscMessage
from pythonosc.osc_message_builder import OscMessageBuilder

from composer.files import read_text
from composer.rig.select import Selector
from composer.score.names import groups_of
from player.engine.process import layout, messages
from player.engine.process.door import Door
from player.engine.process.messages import ASKED, TOLD, Unfit
from player.engine.process.start import shared
from player.inputs.beat import Beat
from player.inputs.events import Timing
from player.inputs.map_file import read_map
from player.inputs.midi import MidiBinds
from player.inputs.midi_clock import ClockFollower
from player.inputs.midi_stream import MidiStream
from player.inputs.mtc import CodeFollower
from player.inputs.osc import OscBinds, known_of
from player.wire import messages as m
from player.wire.device import Build, Device
from player.wire.frames import frame
from player.wire.host import Host
from player.wire.values import DRIVES

from .mutations import mutated_bytes, mutated_json
from .running import Target
from .texts import DEMOS, gannet

CHANNELS = 6


@cache
def gannet_map():
    """The smaller demo's map."""
    known = gannet()
    selector = Selector(known.rig, groups_of(known.score))
    return read_map(read_text(DEMOS / "gannet.map.toml", 1 << 20), "gannet.map.toml", selector, known.score.phrases)


def midi_bytes(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Bytes of a MIDI line, through the stream, the binds and both followers."""
    parts = [
        Message("control_change", channel=0, control=n % 128, value=(n * 37) % 128).bytes()
        for n in (1, 7, 20, 21, 22, 33, 64, 101, 121, 123)
    ]
    parts += [Message("note_on", note=n, velocity=90).bytes() + Message("note_off", note=n).bytes() for n in (36, 48, 60, 72)]
    parts += [
        [0xB0, 21, 64, 53, 12, 21, 65],
        [0xF8] * 24,
        [0xFA],
        [0xFC],
        [0xFB],
        [0xF2, 16, 0],
        [0xFE],
        [0xE0, 0, 64],
        [0xD0, 9],
        [0xA0, 60, 9],
    ]
    parts += [[0xF1, piece << 4 | (piece * 3) % 4] for piece in range(8)] * 2
    parts += [[0xF0, 0x7F, 0x7F, 0x01, 0x01, 0x21, 0x10, 0x20, 0x05, 0xF7], [0xF0, *([1] * 90), 0xF7]]
    whole = bytes(byte for part in parts for byte in part)
    clocks = bytes([0xFA, *([0xF8] * 96), 0xFC, 0xF2, 4, 1, 0xFB, *([0xF8] * 30)])

    def read(data: bytes) -> None:
        stream, binds, known = MidiStream(), MidiBinds(gannet_map(), 12), gannet()
        binds.beat = Beat(0.0, 0.0, 2.0)
        followers, now = (ClockFollower(), CodeFollower()), 0.0
        for start in range(0, min(len(data), 6000), 24):
            for message in stream.feed(data[start : start + 24]):
                now += 0.002 + 0.02 * (message.type == "clock")
                for event in binds.hear("box", message, now):
                    if isinstance(event, Timing):
                        for follower in followers:
                            follower.hear(event)
            binds.tick(now)
            for follower in followers:
                follower.tick(now)
                follower.beat(now)
                follower.turns()
        binds.tick(now + 5.0)
        binds.lost("box", now + 6.0, "gone")
        assert len(known.rig.fibers) == 12

    return [whole, clocks, whole[::2] + clocks], read


def osc_packets(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Packets of OSC, through the reader and the binds."""
    known = known_of(gannet().rig, gannet().score)
    packets = []
    names = [*list(known.fibers)[:2], *list(known.groups)[:2]]
    for address, values in (
        *((f"/drawcord/fiber/{name}", (0.5,)) for name in names[:2]),
        *((f"/drawcord/group/{name}", (0.25,)) for name in names[2:]),
        *((f"/drawcord/phrase/{name}", (0.7,)) for name in list(known.phrases)[:2]),
        ("/drawcord/cue", tuple(list(known.cues)[:1]) or ("none",)),
        ("/drawcord/pause", ()),
        ("/drawcord/vent", ()),
        ("/a", (1, 2.5, "text", b"blob", True, None)),
        *((bind.osc, (0.5,)) for bind in gannet_map().binds if bind.osc),
    ):
        builder = OscMessageBuilder(address)
        for value in values:
            builder.add_arg(value)
        packets.append(builder.build().dgram)
    inner = OscBundleBuilder(1_700_000_001.0)
    for packet in packets[:3]:
        inner.add_content(OscMessage(packet))
    bundle = OscBundleBuilder(1_700_000_000.5)
    bundle.add_content(inner.build())
    bundle.add_content(OscMessage(packets[0]))
    packets.append(bundle.build().dgram)
    packets.append(b"#bundle\0" + struct.pack(">Q", 1) + b"".join(struct.pack(">i", len(one)) + one for one in packets))
    binds = OscBinds(gannet_map(), known)
    now = [0.0]

    def read(data: bytes) -> None:
        now[0] += 0.01
        binds.hear(data, now[0], 1_700_000_000.0)
        binds.tick(now[0])
        assert binds.waiting <= 4096

    return packets, read


# Conversations on the wire: an op, a length, so many bytes; whatever the bytes are, they are a conversation.
OPS = ("device hears", "device is sent a frame", "time", "honest", "host hears", "host is sent a frame", "deed")


def said(*steps: tuple[str, bytes]) -> bytes:
    """Steps as an input."""
    return b"".join(bytes((OPS.index(op),)) + len(body).to_bytes(2, "little") + body for op, body in steps)


def steps_of(data: bytes) -> list[tuple[str, bytes]]:
    """Steps of an input, up to 400."""
    steps, at = [], 0
    while at + 3 <= len(data) and len(steps) < 400:
        length = int.from_bytes(data[at + 1 : at + 3], "little") % 4200
        steps.append((OPS[data[at] % len(OPS)], data[at + 3 : at + 3 + length]))
        at += 3 + length
    return steps


def conversations() -> list[bytes]:
    """Good ones: greeted, configured, armed, sets, rest, vent; a device's own words among them."""

    def time(us: int) -> tuple[str, bytes]:
        return "time", us.to_bytes(4, "little")

    begin = [
        ("deed", b"\0"),
        *([("honest", b"")] * 4),
        time(20_000),
        ("honest", b""),
        ("deed", b"\1"),
        ("honest", b""),
        ("honest", b""),
    ]
    moving = [
        step for n in range(8) for step in (("deed", bytes((4, n, 200 - n, n))), ("honest", b""), time(5_000), ("honest", b""))
    ]
    words = [
        m.Hello(1),
        m.Configure(CHANNELS, 100, 7),
        m.Arm(m.ARM_KEY),
        m.Set(0, 0, (1, 2, 3)),
        m.Set(70_000, 2, (9,)),
        m.Rest(300),
    ]
    words += [m.Ping(5), m.Vent()]
    answers = [
        m.Board(0, 1, CHANNELS, 64, 3, "bench"),
        m.State(50_000, 1, 2, 0, 0, 4321),
        m.Sense(51_000, 0, (1, 2, 3)),
        m.Pong(5, 6),
    ]
    answers += [m.Faulted(3, 1, "set while not armed")]
    alone = [step for n, one in enumerate(words) for step in (("device is sent a frame", m.encode(one, n)), time(2_000))]
    told = [step for n, one in enumerate(answers) for step in (("host is sent a frame", m.encode(one, n)), time(9_000))]
    raw = [("device hears", b"".join(frame(m.encode(one, n)) for n, one in enumerate(words)))]
    raw += [("host hears", b"".join(frame(m.encode(one, n)) for n, one in enumerate(answers)))]
    return [
        said(*begin, *moving, ("deed", b"\2"), time(400_000), *([("honest", b"")] * 3)),
        said(*begin, *moving[:6], *told, *moving, ("deed", b"\3"), ("honest", b""), ("honest", b"")),
        said(*alone, *raw, *alone, time(2_000_000)),
        said(*begin, *raw, time(600_000), ("honest", b""), *told),
    ]


def wire(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """A host and a device, both in Python, that hear each other and whatever else there is on the line."""

    def read(data: bytes) -> None:
        now, valves = 0, [0] * CHANNELS

        def set_valves(first: int, values: Sequence[int]) -> None:
            assert first >= 0 and first + len(values) <= CHANNELS and all(0 <= value <= 65535 for value in values)
            valves[first : first + len(values)] = values

        build = Build("bench", tuple(DRIVES[n % len(DRIVES)] for n in range(CHANNELS)), 64, True, True, 7)
        device = Device(build, 0, set_valves, lambda first, count: [100] * count, lambda: 4321)
        host = Host(CHANNELS, 7, watchdog_ms=100)
        for op, body in steps_of(data):
            second = now * 1e-6
            if op == "device hears":
                device.receive(body, now)
            elif op == "device is sent a frame":
                device.receive(frame(body), now)
            elif op == "time":
                now += int.from_bytes(body[:4], "little") % 3_000_000
                device.advance(now)
                host.tick(now * 1e-6)
            elif op == "honest":
                device.receive(host.to_send(), now)
                host.receive(device.to_send(), second)
            elif op == "host hears":
                host.receive(body, second)
            elif op == "host is sent a frame":
                host.receive(frame(body), second)
            elif body:
                deed = body[0] % 6
                if deed == 0:
                    host.open(second)
                elif deed == 1:
                    host.arm(second)
                elif deed == 2:
                    host.rest(len(body) * 0.1, second)
                elif deed == 3:
                    host.vent(second)
                elif deed == 4:
                    host.set(second + 0.02, 0, [int(byte) * 257 for byte in body[1 : 1 + CHANNELS]], second)
                else:
                    device.fail(m.SENSOR, len(body), "hot", now)
            assert device.queued <= 64
            if device.status != m.ARMED:
                assert not any(valves), "valves are open though the device is not armed"
        assert len(device.to_send()) < 1 << 22
        assert len(host.to_send()) < 1 << 22

    return conversations(), read


def script_of(data: bytes) -> bytes:
    """A conversation as the driver of the device in C plays it: what the device hears, and time."""
    drives = bytes(n % 3 for n in range(CHANNELS))
    script = bytearray(struct.pack("<BIHBBIH", 0, 0, CHANNELS, 3, 1, 7, 64) + drives + b"\5bench")
    now = 0
    for op, body in steps_of(data):
        head = struct.pack("<I", now & 0xFFFFFFFF)
        if op == "time":
            now += int.from_bytes(body[:4], "little") % 3_000_000
            script += b"\2" + struct.pack("<I", now & 0xFFFFFFFF)
        elif op in ("device hears", "host hears"):
            script += b"\1" + head + len(body).to_bytes(2, "little") + body
        elif op in ("device is sent a frame", "host is sent a frame") and len(body) <= 2056:
            whole = frame(body)
            script += b"\1" + head + len(whole).to_bytes(2, "little") + whole
        elif op == "deed" and body:
            text = body[1:30]
            script += b"\3" + head + struct.pack("<BHB", 6 + body[0] % 2, len(body), len(text)) + text
    return bytes(script)


def hostile_c(chance: Random) -> bytes:
    """A script for the driver of the device in C."""
    return script_of(mutated_bytes(chance, conversations()))


def door(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """A front end at the door of a run, after an honest one that watches; and the same lines as a run might say them."""
    good = {
        "version": messages.VERSION,
        "commands": True,
        "answers": False,
        "rule": "rest",
        "from_s": 1.5,
        "to_s": 0.0,
        "down": True,
    }
    lines = [messages.packed("hello", version=messages.VERSION, commands=True, answers=True)]
    lines += [
        messages.packed(name, **{field: good[field] for field in row.fields}) for name, row in ASKED.items() if name != "hello"
    ]
    told = {"flag": True, "number": 1, "text": "run", "object": {}, "list": ["a"], "rule": "go-on", "seconds": 1.0}
    said_by_run = [
        messages.packed(name, **{field: told[kind] for field, kind in row.fields.items()}) for name, row in TOLD.items()
    ]
    descriptor, buffer = shared(layout.size_of(4, 1))
    layout.Writer(buffer, 4, 1)

    def read(data: bytes) -> None:
        made = Door("bench-1", {"title": "Bench piece"}, descriptor, "rest")
        taken: list[str] = []
        made.take = lambda name, fields: taken.append(name) or ""
        made.note = lambda **told: json.dumps(told, allow_nan=False) and None
        ours, theirs = socket.socketpair()
        watcher, other = socket.socketpair()
        try:
            made.adopt(other)
            watcher.sendall(messages.packed("hello", version=messages.VERSION, commands=False, answers=False))
            made.serve()
            made.adopt(theirs)
            ours.setblocking(False)
            for start in range(0, len(data), 3000):
                with suppress(BlockingIOError, ConnectionError):
                    ours.send(data[start : start + 3000])
                made.serve()
            made.serve()
            made.tell(("a line",))
            made.serve()
            assert made.attached >= 1, "the front end that behaves is let go"
        finally:
            for one in (ours, watcher):
                one.close()
            made._memory = descriptor
            made.close()
        for line in data.split(b"\n")[:20]:
            for table, longest in ((ASKED, messages.LONGEST_ASKED), (TOLD, messages.LONGEST_TOLD)):
                with suppress(Unfit):
                    name, _ = messages.read(line, table, longest)
                    assert name in table

    return [b"".join(lines), *(lines[0] + line for line in lines[1:]), b"".join(said_by_run)], read


def hostile_lines(chance: Random, examples: Sequence[bytes]) -> bytes:
    """Lines of JSON, one of them changed as a tree, or all as bytes."""
    if chance.random() < 0.4:
        return mutated_bytes(chance, examples)
    lines = chance.choice(examples).split(b"\n")
    at = chance.randrange(max(len(lines) - 1, 1))
    lines[at] = mutated_json(chance, lines[at])
    return b"\n".join(lines)


TARGETS = (
    Target("midi", midi_bytes, (), 150),
    Target("osc", osc_packets, (), 3000),
    Target("wire", wire, (), 500),
    Target("door", door, (), 600, hostile_lines),
)
