"""The UDP socket that OSC comes in by and goes out by. Nothing is understood here."""

import ipaddress
import socket
from collections.abc import Callable

from composer.faults import fault
from player.inputs.osc_packets import LARGEST

HOST, PORT = "127.0.0.1", 9000
MOST_A_POLL = 512
"""Packets read in one go; a flood beyond is left to the system's own buffer, which drops."""


def read_address(written: str, what: str = "--osc") -> tuple[str, int]:
    """HOST:PORT, PORT alone (then on loopback), or HOST alone. Raises `Faults`."""
    host, colon, port = written.rpartition(":")
    if not colon:
        host, port = ("", written) if written.isdecimal() else (written, str(PORT))
    host = host.strip("[]") or HOST
    if not (port.isdecimal() and len(port) < 6 and 1 <= int(port) <= 65535):
        raise fault(what, f"'{written}' has no port from 1 to 65535", "HOST:PORT, such as 127.0.0.1:9000")
    return host, int(port)


def is_loopback(host: str) -> bool:
    """Whether an address is heard by this machine alone."""
    try:
        return ipaddress.ip_address(host).is_loopback
    except ValueError:
        return host == "localhost"


class OscPort:
    """Hears packets at an address, and sends to others."""

    def __init__(self, host: str = HOST, port: int = PORT):
        """Raises `Faults` where the address cannot be had."""
        try:
            family, kind, _, _, address = socket.getaddrinfo(host, port, type=socket.SOCK_DGRAM, flags=socket.AI_PASSIVE)[0]
            self._socket = socket.socket(family, kind)
        except (OSError, UnicodeError) as error:
            raise fault("--osc", f"'{host}' is no address of this machine: {_why(error)}") from None
        try:
            self._socket.setblocking(False)
            self._socket.bind(address)
        except OSError as error:
            self._socket.close()
            hint = "another program may have it; choose another port"
            raise fault("--osc", f"cannot hear at {host}:{port}: {_why(error)}", hint=hint) from None
        self.address: tuple[str, int] = self._socket.getsockname()[:2]
        self.unsent = 0

    def poll(self, take: Callable[[bytes], None]) -> int:
        """Hand every packet that has come to `take`; returns how many there were."""
        for number in range(MOST_A_POLL):
            try:
                # A byte more than is looked at, so that a larger packet is known for one.
                data, _ = self._socket.recvfrom(LARGEST + 1)
            except BlockingIOError:
                return number
            except OSError:
                # What a receiver that is gone sends back for an earlier packet of ours.
                continue
            take(data)
        return MOST_A_POLL

    def send(self, data: bytes, host: str, port: int) -> None:
        """Send a packet; one that the system cannot take is counted and dropped."""
        try:
            self._socket.sendto(data, (host, port))
        except OSError:
            self.unsent += 1

    def close(self) -> None:
        """Let go of the address."""
        self._socket.close()


def _why(error: Exception) -> str:
    return (error.strerror if isinstance(error, OSError) else "") or str(error)
