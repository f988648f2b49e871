"""What a serial line carries: bytes a second of a run, and the highest rate that a line leaves room for."""

from math import floor

from player.wire.frames import frame_length
from player.wire.messages import VALUES_LIMIT

BITS_A_BYTE = 10
"""8N1: a start bit, eight of data, a stop bit."""
SHARE = 0.95
"""How much of the line a run may fill: what is left lets it catch up, and a vent through, after a hiccup."""
PINGS_HZ = 10.0


def set_bytes(channels: int) -> int:
    """Most bytes on the line for one set of all channels, in as many frames as it needs."""
    full, rest = divmod(channels, VALUES_LIMIT)
    return full * frame_length(8 + 2 * VALUES_LIMIT) + (frame_length(8 + 2 * rest) if rest else 0)


def set_frames(channels: int) -> int:
    """How many frames one set of all channels needs, each of them a place in the device's queue."""
    return -(-channels // VALUES_LIMIT)


def line_load(channels: int, rate_hz: float) -> float:
    """Most bytes a second from host to device for sets of all channels at a rate, pings included."""
    return set_bytes(channels) * rate_hz + frame_length(4) * PINGS_HZ


def line_room(baud: int) -> float:
    """Bytes a second that a run may put on a line of so many baud."""
    return SHARE * baud / BITS_A_BYTE


def highest_rate(channels: int, baud: int) -> int:
    """The highest whole rate in Hz at which a line carries sets of all channels, 0 where it carries not even one a second."""
    return max(0, floor((line_room(baud) - frame_length(4) * PINGS_HZ) / set_bytes(channels)))
