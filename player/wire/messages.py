"""The messages of the wire protocol: one table, from which encoder, decoder, checks, manual and tests are made."""

import struct
from dataclasses import dataclass, make_dataclass
from operator import attrgetter
from typing import Any, Literal

VERSION = 1
ARM_KEY = 0x41524D21
BODY_LIMIT = 2048
"""Most bytes that the body of a frame may have."""
NO_CHANNEL = 0xFFFF
NOT_SENSED = 0xFFFF
SENSES_STRAIN = 1
SENSES_SUPPLY = 2

IDLE, ARMED, VENTED, FAULT = range(4)
STATUSES = ("idle", "armed", "vented", "fault")

WATCHDOG, RIG_MISMATCH, NOT_ARMED, BAD_COMMAND, QUEUE_FULL, OVER_PRESSURE, SENSOR = range(1, 8)
FAULTS = {
    WATCHDOG: "watchdog",
    RIG_MISMATCH: "rig mismatch",
    NOT_ARMED: "not armed",
    BAD_COMMAND: "bad command",
    QUEUE_FULL: "queue full",
    OVER_PRESSURE: "over-pressure",
    SENSOR: "sensor",
}
"""Code of each fault: its name."""

SIZES = {"u8": ("B", 1), "u16": ("H", 2), "u32": ("I", 4)}
"""Name of each type of number: its letter in `struct`, its bytes. All little-endian."""


@dataclass(frozen=True, slots=True)
class Field:
    """A number of fixed size; with `counts` it is the length of the array that ends the body, and no field of the class."""

    name: str
    type: str
    says: str
    counts: bool = False


@dataclass(frozen=True, slots=True)
class Spec:
    """A row of the table: `tail` is what ends the body, an array of u16 or a text, by its name, or nothing."""

    type: int
    name: str
    made: str
    direction: Literal["to device", "to host"]
    fields: tuple[Field, ...]
    says: str
    tail: str = ""
    tail_type: Literal["", "u16s", "text"] = ""
    tail_says: str = ""


_CLOCK = Field("device_us", "u32", "the device's clock, µs, wraps")
_FIRST = Field("first", "u16", "first channel")
_COUNT = Field("count", "u16", "how many values follow", counts=True)

SPECS: tuple[Spec, ...] = (
    Spec(
        0x01, "hello", "Hello", "to device",
        (Field("version", "u8", "of the protocol, 1"),),
        "who is there? Drops the queue and disarms",
    ),
    Spec(
        0x02, "configure", "Configure", "to device",
        (
            Field("channels", "u16", "how many channels will be used, from 0"),
            Field("watchdog_ms", "u16", "longest silence before the device vents, ms"),
            Field("rig", "u32", "CRC-32 of the rig's canonical form"),
        ),
        "what the host will play on",
    ),
    Spec(0x03, "arm", "Arm", "to device", (Field("key", "u32", "0x41524D21"),), "from now on, sets move valves"),
    Spec(
        0x04, "set", "Set", "to device",
        (Field("due_us", "u32", "when, on the device's clock, µs; 0 means now"), _FIRST, _COUNT),
        "values of a row of channels at an instant", "value", "u16s", "by the channel's drive",
    ),
    Spec(0x05, "vent", "Vent", "to device", (), "exhaust every channel now, disarm"),
    Spec(
        0x06, "rest", "Rest", "to device",
        (Field("ramp_ms", "u16", "time to come to rest, ms"),),
        "bring all to rest over that time, then disarm",
    ),
    Spec(0x07, "ping", "Ping", "to device", (Field("host_us", "u32", "the host's clock, µs, wraps"),), "what is your clock?"),
    Spec(
        0x81, "hello", "Board", "to host",
        (
            Field("version", "u8", "of the protocol, 1"),
            Field("flags", "u8", "bit 0 senses strain, bit 1 senses supply"),
            Field("channels", "u16", "how many it has"),
            Field("queue", "u16", "how many sets it can keep waiting"),
            _CLOCK,
        ),
        "who the device is", "name", "text", "UTF-8",
    ),
    Spec(
        0x82, "state", "State", "to host",
        (
            _CLOCK,
            Field("status", "u8", "0 idle, 1 armed, 2 vented, 3 fault"),
            Field("queued", "u16", "sets waiting"),
            Field("late", "u32", "sets that came after their due time"),
            Field("bad", "u32", "frames dropped"),
            Field("supply", "u16", "kPa gauge × 10; 0xFFFF not sensed"),
        ),
        "how the device is; unasked, with seq 0, at 10 Hz or faster",
    ),
    Spec(
        0x83, "sense", "Sense", "to host",
        (_CLOCK, _FIRST, _COUNT),
        "where fibers are", "strain", "u16s", "0 to 65535 is rest to usable stroke",
    ),
    Spec(
        0x84, "fault", "Faulted", "to host",
        (Field("code", "u8", ", ".join(f"{n} {name}" for n, name in FAULTS.items())),
         Field("channel", "u16", "which channel; 0xFFFF none")),
        "what went wrong", "text", "text", "UTF-8, for people",
    ),
    Spec(
        0x87, "pong", "Pong", "to host",
        (Field("host_us", "u32", "as it came in the ping"), _CLOCK),
        "answers ping, with its seq",
    ),
)  # fmt: skip
"""Every message of version 1, in the order of its type."""


class WrongForm(ValueError):
    """Bytes that are no message of the table, or a message with a value that its field cannot hold."""


@dataclass(frozen=True, slots=True)
class _Codec:
    """A row made ready for use: the class, the packing of its numbers, and how to get at them."""

    spec: Spec
    make: type
    pack: struct.Struct
    limits: tuple[tuple[str, int], ...]
    numbers: Any
    ask: int


def _codec(spec: Spec) -> _Codec:
    names = [field.name for field in spec.fields if not field.counts]
    hints: list[Any] = [(name, int) for name in names]
    if spec.tail:
        hints.append((spec.tail, str if spec.tail_type == "text" else tuple[int, ...]))
    doc = f"{spec.name}, 0x{spec.type:02X}, {spec.direction}: {spec.says}."
    make = make_dataclass(spec.made, hints, frozen=True, slots=True, namespace={"__doc__": doc, "__module__": __name__})
    pack = struct.Struct("<" + "".join(SIZES[field.type][0] for field in spec.fields))
    limits = tuple((field.name, (1 << 8 * SIZES[field.type][1]) - 1) for field in spec.fields if not field.counts)
    numbers = attrgetter(*names) if len(names) > 1 else (lambda m: (getattr(m, names[0]),)) if names else (lambda m: ())
    return _Codec(spec, make, pack, limits, numbers, pack.size)


_BY_TYPE = {spec.type: _codec(spec) for spec in SPECS}
_BY_CLASS = {codec.make: codec for codec in _BY_TYPE.values()}
MADE: dict[str, type] = {codec.spec.made: codec.make for codec in _BY_TYPE.values()}
"""Each message's class by its name."""

Hello, Configure, Arm, Set, Vent, Rest, Ping = (MADE[n] for n in ("Hello", "Configure", "Arm", "Set", "Vent", "Rest", "Ping"))
Board, State, Sense, Faulted, Pong = (MADE[n] for n in ("Board", "State", "Sense", "Faulted", "Pong"))

VALUES_LIMIT = (BODY_LIMIT - 8) // 2
"""Most values that one `set` or `sense` carries."""
TO_DEVICE = frozenset(spec.type for spec in SPECS if spec.direction == "to device")


def encode(message: Any, seq: int) -> bytes:
    """The message as type, sequence number and body, still without CRC and stuffing.

    Raises WrongForm where a value does not fit its field, naming it.
    """
    codec = _BY_CLASS[type(message)]
    spec = codec.spec
    numbers = codec.numbers(message)
    tail = b""
    try:
        if spec.tail_type == "u16s":
            values = getattr(message, spec.tail)
            tail = struct.pack(f"<{len(values)}H", *values)
            numbers = (*numbers, len(values))
        elif spec.tail_type == "text":
            tail = getattr(message, spec.tail).encode("utf-8", "replace")
        head = codec.pack.pack(*numbers)
    except (struct.error, TypeError) as error:
        raise _wrong(codec, message) from error
    if len(head) + len(tail) > BODY_LIMIT:
        raise WrongForm(f"{spec.name}: a body of {len(head) + len(tail)} bytes, expected at most {BODY_LIMIT}")
    return bytes((spec.type, seq)) + head + tail


def _wrong(codec: _Codec, message: Any) -> WrongForm:
    """What is wrong with a message that would not pack."""
    for name, high in codec.limits:
        value = getattr(message, name)
        if not isinstance(value, int) or not 0 <= value <= high:
            return WrongForm(f"{codec.spec.name}: {name} is {value!r}, expected a whole number, 0 to {high}")
    values = getattr(message, codec.spec.tail)
    for place, value in enumerate(values):
        if not isinstance(value, int) or not 0 <= value <= 0xFFFF:
            return WrongForm(f"{codec.spec.name}: {codec.spec.tail} {place} is {value!r}, expected a whole number, 0 to 65535")
    return WrongForm(f"{codec.spec.name}: {len(values)} values, expected at most {VALUES_LIMIT}")


def decode(payload: bytes) -> Any:
    """The message in type, sequence number and body.

    Raises WrongForm for an unknown type, a body of the wrong size, a count that is not that of the values.
    """
    if len(payload) < 2:
        raise WrongForm(f"a frame of {len(payload)} bytes, expected type and sequence number at least")
    codec = _BY_TYPE.get(payload[0])
    if codec is None:
        raise WrongForm(f"type 0x{payload[0]:02X} is no message of version {VERSION}")
    spec, rest = codec.spec, len(payload) - 2 - codec.ask
    if rest < 0 or (rest and not spec.tail) or len(payload) - 2 > BODY_LIMIT:
        raise WrongForm(f"{spec.name}: a body of {len(payload) - 2} bytes, expected {codec.ask}{' or more' * bool(spec.tail)}")
    numbers = codec.pack.unpack_from(payload, 2)
    if not spec.tail:
        return codec.make(*numbers)
    if spec.tail_type == "text":
        # A device's text is for people to read: a letter lost is better than a fault lost.
        return codec.make(*numbers, payload[2 + codec.ask :].decode("utf-8", "replace"))
    if rest != 2 * numbers[-1]:
        raise WrongForm(f"{spec.name}: count is {numbers[-1]}, and {rest} bytes of values follow")
    return codec.make(*numbers[:-1], struct.unpack_from(f"<{numbers[-1]}H", payload, 2 + codec.ask))


def spec_of(message: Any) -> Spec:
    """The table's row of a message or of its class."""
    return _BY_CLASS[message if isinstance(message, type) else type(message)].spec
