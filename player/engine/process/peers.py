"""Who is at the other end of a local socket, as the system knows it."""

import os
import socket
import struct
import sys


class Stranger(Exception):
    """Another user's process is at the other end; the text says so, for the operator."""


def peer_uid(connection: socket.socket) -> int:
    """The number of the user whose process is at the other end of a connected local socket. Raises OSError."""
    if hasattr(socket, "SO_PEERCRED"):
        _, uid, _ = struct.unpack("3i", connection.getsockopt(socket.SOL_SOCKET, socket.SO_PEERCRED, struct.calcsize("3i")))
        return uid
    if sys.platform == "darwin" or "bsd" in sys.platform:
        # struct xucred of LOCAL_PEERCRED: a version, then the user's number.
        _, uid = struct.unpack_from("II", connection.getsockopt(0, 1, 76))
        return uid
    raise OSError("this system does not say whose the other end of a local socket is")


def check_peer(connection: socket.socket) -> None:
    """Raise Stranger where the other end is not this very user's."""
    try:
        uid = peer_uid(connection)
    except OSError as why:
        raise Stranger(f"it cannot be told whose the other end is: {why}") from None
    if uid != os.geteuid():
        raise Stranger(f"that belongs to another user ({name_of(uid)}): only they may attach to their runs")


def name_of(uid: int) -> str:
    """A user's name, or the number where there is none."""
    try:
        import pwd

        return pwd.getpwuid(uid).pw_name
    except (ImportError, KeyError):
        return f"number {uid}"
