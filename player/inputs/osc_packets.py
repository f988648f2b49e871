"""Packets of Open Sound Control 1.0 taken apart: bytes in, messages with their time tags out, or the reason for a refusal.

A packet is taken whole or not at all. Bundles within bundles are walked without recursion, and everything is bounded by
the bytes that came.
"""

import math
import struct
from dataclasses import dataclass

LARGEST = 8192
"""Bytes of a packet that are looked at."""

DEEPEST = 8
MOST_MESSAGES = 256

IMMEDIATELY = 1
_BUNDLE = b"#bundle\0"
_SINCE_1900_S = 2_208_988_800
"""Seconds from 1900, where time tags begin, to 1970."""

REFUSED = {
    "large": f"packets of more than {LARGEST} bytes",
    "malformed": "packets that are no Open Sound Control",
    "deep": f"bundles more than {DEEPEST} deep, or more than {MOST_MESSAGES} messages in a packet",
    "address": "addresses that mean nothing here",
    "name": "fibers, groups, phrases or cues that there are not",
    "type": "arguments of a wrong type or number",
    "value": "numbers that are no finite number from 0 to 1",
    "late": "time tags too far ahead",
    "full": "messages for later, more than can be kept",
    "fast": "packets above the rate that is taken",
}
"""Why something is refused, by the name under which it is counted."""


class Refused(Exception):
    """A packet, or a message of it, that changes nothing; `why` is a key of `REFUSED`."""

    def __init__(self, why: str):
        self.why = why
        super().__init__(REFUSED[why])


@dataclass(frozen=True, slots=True)
class OscMessage:
    """An address and its arguments, each with the letter of its type; `tag` is the time tag, IMMEDIATELY outside bundles."""

    address: str
    types: str
    arguments: tuple[float | int | str | bytes | bool | None, ...]
    tag: int = IMMEDIATELY


def read_packet(data: bytes) -> list[OscMessage]:
    """The messages of a packet in their order. Raises `Refused`."""
    if len(data) > LARGEST:
        raise Refused("large")
    found: list[OscMessage] = []
    # Elements still to be read, the next one last: where each begins and ends, the tag that holds there, how deep it is.
    waiting = [(0, len(data), IMMEDIATELY, 0)]
    while waiting:
        begin, end, tag, depth = waiting.pop()
        if end - begin < 4 or (end - begin) % 4:
            raise Refused("malformed")
        if data[begin : begin + 8] != _BUNDLE:
            found.append(_message(data[begin:end], tag))
        else:
            if depth >= DEEPEST:
                raise Refused("deep")
            waiting += reversed(_elements(data, begin, end, tag, depth))
        if len(found) + len(waiting) > MOST_MESSAGES:
            raise Refused("deep")
    return found


def _elements(data: bytes, begin: int, end: int, outer: int, depth: int) -> list[tuple[int, int, int, int]]:
    """The elements of a bundle."""
    if end - begin < 16:
        raise Refused("malformed")
    tag = int.from_bytes(data[begin + 8 : begin + 16], "big")
    if tag < outer and outer != IMMEDIATELY:
        # The standard asks that a bundle within another is not due before it.
        raise Refused("malformed")
    at, elements = begin + 16, []
    while at < end:
        size = int.from_bytes(data[at : at + 4], "big", signed=True) if end - at >= 4 else -1
        if size < 0 or size > end - at - 4:
            raise Refused("malformed")
        elements.append((at + 4, at + 4 + size, tag, depth + 1))
        at += 4 + size
        if len(elements) > MOST_MESSAGES:
            raise Refused("deep")
    return elements


def _message(data: bytes, tag: int) -> OscMessage:
    address, at = _string(data, 0)
    if not address.startswith("/"):
        raise Refused("malformed")
    if at >= len(data):
        # Old senders leave out the type tags of a message without arguments.
        return OscMessage(address, "", (), tag)
    types, at = _string(data, at)
    if not types.startswith(","):
        raise Refused("malformed")
    values = []
    for letter in types[1:]:
        value, at = _argument(data, at, letter)
        values.append(value)
    if at != len(data):
        raise Refused("malformed")
    return OscMessage(address, types[1:], tuple(values), tag)


def _string(data: bytes, at: int) -> tuple[str, int]:
    """A text with its zeros, and where what follows it begins."""
    end = data.find(b"\0", at)
    if end < 0:
        raise Refused("malformed")
    after = end + 4 - (end - at) % 4
    if after > len(data) or any(data[end:after]):
        raise Refused("malformed")
    try:
        # The standard has ASCII; names of cues are UTF-8, which holds it.
        return data[at:end].decode(), after
    except UnicodeDecodeError:
        raise Refused("malformed") from None


_FIXED = {"i": ">i", "f": ">f", "h": ">q", "d": ">d", "t": ">Q", "c": ">I", "r": ">I", "m": ">I"}
_NAMED = {"T": True, "F": False, "N": None, "I": math.inf}


def _argument(data: bytes, at: int, letter: str) -> tuple[float | int | str | bytes | bool | None, int]:
    """An argument of the type of that letter, and where what follows it begins."""
    if letter in _FIXED:
        form = _FIXED[letter]
        size = struct.calcsize(form)
        if at + size > len(data):
            raise Refused("malformed")
        return struct.unpack_from(form, data, at)[0], at + size
    if letter in _NAMED:
        return _NAMED[letter], at
    if letter in "sS":
        return _string(data, at)
    if letter == "b":
        size = int.from_bytes(data[at : at + 4], "big", signed=True) if at + 4 <= len(data) else -1
        after = at + 4 + size + -size % 4
        if size < 0 or after > len(data):
            raise Refused("malformed")
        return data[at + 4 : at + 4 + size], after
    raise Refused("malformed")


def seconds_ahead(tag: int, unix_s: float) -> float:
    """How far ahead of the time of day `unix_s`, seconds since 1970, a time tag lies; 0 for one that is past, or at once."""
    if tag == IMMEDIATELY:
        return 0.0
    whole, part = divmod(tag, 1 << 32)
    return max(0.0, (whole - _SINCE_1900_S - unix_s) + part / (1 << 32))


def tag_of(unix_s: float) -> int:
    """The time tag of a time of day, seconds since 1970."""
    whole = math.floor(unix_s)
    return (whole + _SINCE_1900_S) << 32 | min((1 << 32) - 1, round((unix_s - whole) * (1 << 32)))
