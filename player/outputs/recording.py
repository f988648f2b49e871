"""The format of a recording: what was sent to the boards of a rig, with its due times, to be played back as it was.

Little-endian. A head, then frames, up to a frame of kind E, which says that the recording is complete.

    head    MAGIC (8 bytes) version:u16 rig:u32 (fingerprint) rate_mHz:u32 drivers:u8 path:u16
            path bytes of UTF-8: the rig file, relative to the recording's folder
            for each driver: length:u8, name in UTF-8, channels:u16
            crc:u32
    frame   kind:u8 time_us:u64 [value:u16 for every channel of every driver, in the head's order: kind S only] crc:u32

Kinds: S a set; R the boards are told to rest and disarm; V they are told to vent; E the end. Times are due times from the first
set on, and never fall. A value means what it does on the wire. crc is CRC-32 (as in zlib) over what stands before it, from the
head's or the frame's first byte. Whatever follows a frame that is cut off or fails its crc is not played.
"""

import struct
import zlib
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.faults import fault

MAGIC = b"drawcrec"
VERSION = 1
LARGEST_BYTES = 1 << 30
"""A recording of more bytes is refused: 48 fibers at 500 Hz fill it in five hours and a half."""

SET, REST, VENT, END = b"S", b"R", b"V", b"E"
_HEAD = struct.Struct("<8sHIIBH")
_FRAME = struct.Struct("<cQ")
_CRC = struct.Struct("<I")
_U16 = struct.Struct("<H")


@dataclass(frozen=True, slots=True, eq=False)
class Recording:
    """A recording as read.

    rig_path: as written, "" for none; fingerprint: of the rig; rate_Hz: sets a second
    drivers: names and channels; time_s: (N,) due times of its sets; values: (N, C) as on the wire, C channels of all drivers
    complete: whether it came to its end; ended: "rest", "vent", or "" where neither was recorded
    """

    rig_path: str
    fingerprint: int
    rate_Hz: float
    drivers: tuple[tuple[str, int], ...]
    time_s: NDArray[np.float64]
    values: NDArray[np.uint16]
    complete: bool
    ended: str


def head(fingerprint: int, rate_Hz: float, drivers: tuple[tuple[str, int], ...], rig_path: str) -> bytes:
    """The bytes that a recording begins with."""
    path = rig_path.encode()
    data = _HEAD.pack(MAGIC, VERSION, fingerprint, round(rate_Hz * 1000.0), len(drivers), len(path)) + path
    for name, channels in drivers:
        spelt = name.encode()
        data += bytes([len(spelt)]) + spelt + _U16.pack(channels)
    return data + _CRC.pack(zlib.crc32(data))


def frame(kind: bytes, time_s: float, values: NDArray[np.uint16] | None = None) -> bytes:
    """The bytes of one frame; `values` (C,) for a set."""
    data = _FRAME.pack(kind, max(0, round(time_s * 1e6))) + (b"" if values is None else values.astype("<u2").tobytes())
    return data + _CRC.pack(zlib.crc32(data))


def read(data: bytes, file: str) -> Recording:
    """A recording from its bytes; time and memory in proportion to them, whatever they say.

    Raises:
        Faults: no recording, another version, a damaged head, or no set in it.
    """
    if not data.startswith(MAGIC):
        raise fault(file, "this is no recording", "a file written by 'drawcord play ... --to file:PATH'")
    try:
        _, version, fingerprint, rate_mHz, count, length = _HEAD.unpack_from(data)
        if version != VERSION:
            raise fault(file, f"a recording of version {version}", f"version {VERSION}", "record it again with this drawcord")
        at = _HEAD.size + length
        path = data[_HEAD.size : at].decode()
        drivers = []
        for _ in range(count):
            name = data[at + 1 : at + 1 + data[at]].decode()
            at += 1 + data[at]
            drivers.append((name, _U16.unpack_from(data, at)[0]))
            at += _U16.size
        if _CRC.unpack_from(data, at)[0] != zlib.crc32(data[:at]):
            raise ValueError
    except (struct.error, IndexError, ValueError):
        raise fault(file, "the head of this recording is damaged or cut off", hint="record it again") from None
    channels = sum(channels for _, channels in drivers)
    times, values, complete, ended = _frames(memoryview(data)[at + _CRC.size :], channels)
    if not len(times):
        raise fault(file, "there is not one whole set in this recording", hint="record it again")
    return Recording(path, fingerprint, rate_mHz / 1000.0, tuple(drivers), times, values, complete, ended)


def _frames(data: memoryview, channels: int) -> tuple[NDArray[np.float64], NDArray[np.uint16], bool, str]:
    times: list[int] = []
    places: list[int] = []
    at, last, complete, ended = 0, 0, False, ""
    while at + _FRAME.size + _CRC.size <= len(data):
        kind, time_us = _FRAME.unpack_from(data, at)
        end = at + _FRAME.size + (2 * channels if kind == SET else 0)
        known = kind in (SET, REST, VENT, END)
        if not known or end + _CRC.size > len(data) or time_us < last or time_us > 1 << 50:
            break
        if _CRC.unpack_from(data, end)[0] != zlib.crc32(data[at:end]):
            break
        if kind == SET:
            times.append(time_us)
            places.append(at + _FRAME.size)
        elif kind == END:
            complete = True
            break
        else:
            ended = "rest" if kind == REST else "vent"
        at, last = end + _CRC.size, time_us
    values = np.empty((len(times), channels), dtype=np.uint16)
    for row, place in enumerate(places):
        values[row] = np.frombuffer(data[place : place + 2 * channels], dtype="<u2")
    return np.array(times, dtype=float) * 1e-6, values, complete, ended
