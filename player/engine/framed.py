"""Records one after another, each framed and checksummed, so that a file cut off at any byte can be read up to there.

Little-endian. A record is

    length:u32  kind:u8  time_us:u64  body: `length` bytes  crc:u32

crc is CRC-32 (as in zlib) over length, kind, time and body. Run logs and takes are such files.
"""

import struct
import zlib
from collections.abc import Collection, Iterator

_FRAME = struct.Struct("<IBQ")
_CRC = struct.Struct("<I")

LARGEST_BODY = 1 << 22
"""Bytes; a longer record is no record."""


def framed(kind: int, time_us: int, body: bytes) -> bytes:
    """One record."""
    data = _FRAME.pack(len(body), kind, time_us) + body
    return data + _CRC.pack(zlib.crc32(data))


def frames(data: bytes, at: int, kinds: Collection[int]) -> Iterator[tuple[int, int, bytes, int]]:
    """Kind, time in µs and body of each whole record from byte `at` on, and where it ends; stops before the first that is
    cut off, damaged, too long or of no kind that is known."""
    while at + _FRAME.size + _CRC.size <= len(data):
        length, kind, time_us = _FRAME.unpack_from(data, at)
        end = at + _FRAME.size + length
        if length > LARGEST_BODY or kind not in kinds or end + _CRC.size > len(data):
            return
        if zlib.crc32(data[at:end]) != _CRC.unpack_from(data, end)[0]:
            return
        body, at = data[at + _FRAME.size : end], end + _CRC.size
        yield kind, time_us, body, at
