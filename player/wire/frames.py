"""Frames: a message and its CRC, stuffed so that 0x00 stands between frames and nowhere else.

Stuffing is COBS (S. Cheshire and M. Baker, "Consistent Overhead Byte Stuffing", IEEE/ACM Transactions on Networking 7(2),
1999). The CRC is CRC-16/IBM-3740 over type, sequence number and body, sent low byte first.
"""

from binascii import crc_hqx
from collections.abc import Iterator

from player.wire.messages import BODY_LIMIT

PAYLOAD_LIMIT = 2 + BODY_LIMIT
"""Most bytes of type, sequence number and body."""


def crc16(data: bytes) -> int:
    """CRC-16/IBM-3740 (CCITT-FALSE): polynomial 0x1021, initial 0xFFFF, not reflected, no final exclusive-or."""
    return crc_hqx(data, 0xFFFF)


def stuffed_length(length: int) -> int:
    """Most bytes that `length` bytes take when stuffed: one more, and one for every 254."""
    return length + 1 + length // 254


ENCODED_LIMIT = stuffed_length(PAYLOAD_LIMIT + 2)
"""Most bytes of a frame between two delimiters."""


def stuff(data: bytes) -> bytes:
    """COBS without the delimiter. A last block of all 254 bytes is followed by a code 0x01, as in the paper's program."""
    out = bytearray()
    for block in data.split(b"\0"):
        if len(block) >= 254:
            for start in range(0, len(block) - 253, 254):
                out.append(0xFF)
                out += block[start : start + 254]
            block = block[len(block) - len(block) % 254 :]
        out.append(len(block) + 1)
        out += block
    return bytes(out)


def unstuff(data: bytes) -> bytes:
    """What was stuffed, with or without a code 0x01 after a full last block.

    Raises ValueError where a code is zero or points past the end, or where there is nothing.
    """
    out = bytearray()
    at, end = 0, len(data)
    if not end:
        raise ValueError("nothing to unstuff")
    while True:
        code = data[at]
        past = at + code
        if not code or past > end:
            raise ValueError(f"code {code} at byte {at} of {end}")
        out += data[at + 1 : past]
        if past == end:
            break
        if code != 0xFF:
            out.append(0)
        at = past
    if 0 in data:
        raise ValueError("a zero inside a frame")
    return bytes(out)


def frame(payload: bytes) -> bytes:
    """Type, sequence number and body as they go over the line, delimiter included."""
    return stuff(payload + crc16(payload).to_bytes(2, "little")) + b"\0"


def frame_length(body: int) -> int:
    """Most bytes on the line of a frame with a body of so many bytes."""
    return stuffed_length(body + 4) + 1


class FrameReader:
    """Bytes in, payloads out; what is no frame is dropped and counted, and the next 0x00 begins anew.

    bad: frames dropped since the start: not COBS, too short, too long, CRC wrong. A second 0x00 in a row is no frame.
    rests: what was dropped uncounted, see `begin_amid`
    Never keeps more than one frame's bytes.
    """

    __slots__ = ("_amid", "_kept", "_too_long", "bad", "rests")

    def __init__(self) -> None:
        self.bad = self.rests = 0
        self._kept = bytearray()
        self._too_long = self._amid = False

    def begin_amid(self) -> None:
        """A line is listened to from now on, perhaps from the midst of a frame: what is left of that is dropped, uncounted."""
        self._kept.clear()
        self._too_long, self._amid = False, True

    def feed(self, data: bytes) -> list[bytes]:
        """Take bytes as they came, in pieces of any size; returns the payloads (type, seq, body) that they complete."""
        return list(self.frames(data))

    def frames(self, data: bytes) -> Iterator[bytes]:
        """As `feed`, one after the other: at each payload `bad` counts what was dropped before it.

        To be gone through to its end.
        """
        pieces = data.split(b"\0")
        last = len(pieces) - 1
        for place, piece in enumerate(pieces):
            if not self._too_long:
                if len(self._kept) + len(piece) > ENCODED_LIMIT:
                    self._kept.clear()
                    self._too_long = True
                else:
                    self._kept += piece
            if place == last:
                break
            if self._too_long:
                self._drop()
            elif self._kept:
                payload = _opened(bytes(self._kept))
                if payload is None:
                    self._drop()
                else:
                    yield payload
            self._kept.clear()
            self._too_long = self._amid = False

    def _drop(self) -> None:
        if self._amid:
            self.rests += 1
        else:
            self.bad += 1


def _opened(stuffed: bytes) -> bytes | None:
    """The payload of a frame, or None where it is no frame."""
    try:
        plain = unstuff(stuffed)
    except ValueError:
        return None
    if not 4 <= len(plain) <= PAYLOAD_LIMIT + 2 or crc16(plain[:-2]) != plain[-2] | plain[-1] << 8:
        return None
    return plain[:-2]
