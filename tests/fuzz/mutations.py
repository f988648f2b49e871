"""Good inputs made bad: bytes, words, numbers, trees changed at random; all from one `Random`, so that it can be had again."""

import json
import re
import struct
from collections.abc import Sequence
from random import Random
from typing import Any

MOST_BYTES = 1 << 18
"""No mutation makes an input longer than this: size limits are tested where they stand."""

NUMBERS = (
    "0", "-0", "1", "-1", "0.0", "1e-9", "1e-300", "1e300", "-1e300", "1e999", "nan", "inf", "-inf", "+1", "1_0", "0x10",
    "1e", ".5", "255", "256", "32768", "65535", "65536", "2147483648", "4294967296", "18446744073709551616", "9" * 40,
    "9" * 5000, "1/0", "0/1", "1/3", "999999999999/7", "0.1" + "0" * 400, "1:1", "0:0", "99999999:1", "1:99999999", "-1:-1",
    "1e5", "100000", "1000000", "5.000001",
)  # fmt: skip
PIECES = (
    "[", "]", "{", "}", "(", ")", '"', "'", '"""', "#", ",", ";", ":", "=", "/", "\\", "..", "*", "?", "%", "\t", "\r", "\n",
    "\r\n", "\x0b", "\x1b[2J", "\x7f", "\x00", "\ufeff", "\u202e", "\u2028", "é", "漢", "😀", "a\u0301", "[[", "]]", "[" * 300,
    "{a=" * 120, "a." * 200 + "b", "x" * 5000, " " * 5000, "- ", "--", "true", "false", "null", "None", "at", "to", "from",
    "every", "over", "until", "times", "rest",
)  # fmt: skip
WORDS = (0, 1, 0x7F, 0x80, 0xFF, 0x7FFF, 0x8000, 0xFFFF, 0x7FFFFFFF, 0x80000000, 0xFFFFFFFF, 0x7FFFFFFFFFFFFFFF, (1 << 64) - 1)
REALS = (0.0, -0.0, 1.0, -1.0, float("nan"), float("inf"), float("-inf"), 5e-324, 1.8e308, -1.8e308, 1e-9, 1e9, 1e15)
ODD = (
    None, True, False, 0, -1, 3, 0.5, 1e308, -1e308, float("nan"), float("inf"), 1 << 70, -(1 << 70), "", "nan", "x" * 3000,
    "\x00\x1b[2J", "\ud800", [], {}, [[]], [None], {"say": {}}, [1, "2"],
)  # fmt: skip
_TOKEN = re.compile(rb"[A-Za-z_][\w.-]*|[+-]?\d[\d.eE/:+-]*|\s+|.", re.DOTALL)
_NUMBER = re.compile(rb"[+-]?\d[\d.eE/:]*")


def mutated_bytes(chance: Random, examples: Sequence[bytes]) -> bytes:
    """One of the examples, changed in a few places; now and then no more than noise."""
    if chance.random() < 0.02:
        return chance.randbytes(chance.randrange(300))
    data = bytearray(chance.choice(examples))
    for _ in range(_some(chance)):
        chance.choice(_BYTES)(chance, data, examples)
    return bytes(data[:MOST_BYTES])


def mutated_text(chance: Random, examples: Sequence[bytes]) -> bytes:
    """The same for what people write: words, numbers and lines."""
    if chance.random() < 0.1:
        return mutated_bytes(chance, examples)
    data = bytearray(chance.choice(examples))
    for _ in range(_some(chance)):
        chance.choice(_TEXTS)(chance, data, examples)
    return bytes(data[:MOST_BYTES])


def mutated_tree(chance: Random, value: Any) -> Any:
    """A value of JSON with one part of it replaced, doubled or taken out."""
    if chance.random() < 0.15 or not isinstance(value, dict | list) or not value:
        return odd_value(chance)
    if isinstance(value, list):
        at, changed = chance.randrange(len(value)), list(value)
    else:
        at, changed = chance.choice(list(value)), dict(value)
    kind = chance.random()
    if kind < 0.7:
        changed[at] = mutated_tree(chance, value[at])
    elif kind < 0.85:
        del changed[at]
    elif isinstance(changed, list):
        changed.insert(at, changed[at])
    else:
        changed[f"{at}_{chance.randrange(9)}"] = changed[at]
    return changed


def odd_value(chance: Random) -> Any:
    """A value that nobody expects there."""
    if chance.random() < 0.05:
        deep: Any = 1
        for _ in range(chance.choice((10, 200, 900))):
            deep = [deep]
        return deep
    return chance.choice(ODD)


def mutated_json(chance: Random, body: bytes) -> bytes:
    """The bytes of a JSON value, changed as a tree or as a text."""
    if chance.random() < 0.75:
        try:
            return json.dumps(mutated_tree(chance, json.loads(body))).encode()
        except (ValueError, RecursionError):
            pass
    return mutated_text(chance, [body])


def _some(chance: Random) -> int:
    return 1 if chance.random() < 0.5 else chance.randrange(1, 9)


def _place(chance: Random, data: bytearray) -> int:
    return chance.randrange(len(data) + 1)


def _flip(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    if data:
        data[chance.randrange(len(data))] ^= 1 << chance.randrange(8)


def _byte(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    if data:
        data[chance.randrange(len(data))] = chance.choice(
            (0, 1, 0x7F, 0x80, 0xC3, 0xF0, 0xF7, 0xFE, 0xFF, chance.randrange(256))
        )


def _word(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    """A number of a size at a place, in one order of bytes or the other, or a real number that is none."""
    kind = chance.choice(("B", "H", "I", "Q", "f", "d"))
    order = chance.choice("<>")
    if kind in "fd":
        value = chance.choice(REALS)
        put = struct.pack(order + kind, value if kind == "d" or abs(value) < 3e38 or value != value else float("inf"))
    else:
        size = struct.calcsize(kind)
        value = chance.choice(WORDS) + chance.randrange(-1, 2) if chance.random() < 0.8 else chance.getrandbits(8 * size)
        put = (value % (1 << 8 * size)).to_bytes(size, "little" if order == "<" else "big")
    at = _place(chance, data)
    data[at : at + len(put)] = put


def _cut(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    del data[_place(chance, data) :]


def _drop(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    at = _place(chance, data)
    del data[at : at + chance.choice((1, 2, 4, 8, 16, chance.randrange(1, 400)))]


def _insert(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    at = _place(chance, data)
    data[at:at] = chance.randbytes(chance.choice((1, 1, 2, 4, 16)))


def _repeat(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    at = _place(chance, data)
    piece = bytes(data[at : at + chance.choice((1, 3, 16, 100))])
    times = chance.choice((1, 1, 2, 5, 50, 700))
    if len(data) + len(piece) * times < MOST_BYTES:
        data[at:at] = piece * times


def _splice(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    other = chance.choice(examples)
    first = chance.randrange(len(other) + 1)
    piece = other[first : first + chance.choice((4, 30, 200, 2000))]
    at = _place(chance, data)
    if chance.random() < 0.5:
        data[at:at] = piece
    else:
        data[at : at + len(piece)] = piece


def _number(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    found = list(_NUMBER.finditer(bytes(data)))
    if found:
        match = chance.choice(found)
        data[match.start() : match.end()] = chance.choice(NUMBERS).encode()


def _scaled(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    """A number that is still one, but another."""
    found = list(_NUMBER.finditer(bytes(data)))
    if found:
        match = chance.choice(found)
        try:
            value = float(match[0])
        except ValueError:
            return
        data[match.start() : match.end()] = (
            f"{value * chance.choice((0.0, -1.0, 0.1, 0.5, 2.0, 10.0, 100.0, 1000.0, 1e6)):g}".encode()
        )


def _piece(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    at = _place(chance, data)
    data[at:at] = chance.choice(PIECES).encode("utf-8", "replace")


def _token(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    """A word replaced by another one of any example, taken out, or doubled."""
    mine = list(_TOKEN.finditer(bytes(data)))
    if not mine:
        return
    match, kind = chance.choice(mine), chance.random()
    if kind < 0.6:
        other = chance.choice(examples)
        near = chance.randrange(len(other) + 1)
        put = _TOKEN.search(other, near)
        data[match.start() : match.end()] = put[0] if put else b""
    elif kind < 0.8:
        del data[match.start() : match.end()]
    else:
        data[match.start() : match.start()] = match[0]


def _line(chance: Random, data: bytearray, examples: Sequence[bytes]) -> None:
    """Lines taken out, doubled, moved, or taken from elsewhere."""
    lines = bytes(data).split(b"\n")
    at, kind = chance.randrange(len(lines)), chance.random()
    if kind < 0.25:
        del lines[at]
    elif kind < 0.5:
        lines[at:at] = [lines[at]] * chance.choice((1, 1, 2, 40))
    elif kind < 0.75:
        lines.insert(chance.randrange(len(lines)), lines.pop(at))
    else:
        lines.insert(at, chance.choice(chance.choice(examples).split(b"\n")))
    data[:] = b"\n".join(lines)


_BYTES = (_flip, _flip, _byte, _word, _word, _cut, _drop, _insert, _repeat, _splice)
_TEXTS = (_number, _number, _scaled, _scaled, _piece, _token, _token, _line, _line, _repeat, _splice, _cut, _byte)
