"""A serial port as bytes in and bytes out; nothing here knows what the bytes mean."""

import errno
import fcntl
import grp
import os
import select
import termios
from contextlib import suppress

from composer.faults import Faults, fault
from player.outputs.base import LinkLost
from player.outputs.serial_ports import ports_found

BAUD = 115_200
SLOWEST, FASTEST = 115_200, 2_000_000
READ_BYTES = 65_536
DRAIN_TRIES, DRAIN_S = 5, 0.02


class LineLost(LinkLost):
    """The port is gone: unplugged, or its other end closed."""


class SerialLine:
    """A port at a baud rate, 8N1, for this process alone; a pseudo-terminal is a port too. All verbs but `open` return at once.

    `open` raises Faults that say what to do; `read` and `write` raise LineLost.
    """

    def __init__(self, port: str, baud: int = BAUD):
        self.port, self.baud = port, baud
        self._serial = None
        self._fd = -1
        self._waiting = bytearray()

    def open(self) -> None:
        """Take hold of the port.

        Raises Faults where it does not exist, is no serial port, is busy or not permitted, or the baud rate is not possible.
        """
        import serial

        if not SLOWEST <= self.baud <= FASTEST:
            raise fault(self.port, f"{self.baud} baud", f"{SLOWEST} to {FASTEST} baud")
        try:
            self._serial = serial.Serial(self.port, self.baud, timeout=0, write_timeout=0, exclusive=True)
        except (serial.SerialException, OSError, ValueError, termios.error) as error:
            raise _cannot_open(self.port, self.baud, error) from None
        self._fd = self._serial.fileno()
        os.set_blocking(self._fd, False)
        if not self.port.startswith("/dev/pts/"):
            # The lock above holds off those who lock too; this holds off everyone. A pseudo-terminal would keep it after us.
            with suppress(OSError):
                fcntl.ioctl(self._fd, termios.TIOCEXCL)
        with suppress(OSError, ValueError, AttributeError, NotImplementedError):
            self._serial.set_low_latency_mode(True)
        self._waiting.clear()

    def fileno(self) -> int:
        """For `select`."""
        return self._fd

    def read(self) -> bytes:
        """All bytes that have come; none where none has."""
        got = bytearray()
        try:
            while len(got) < READ_BYTES:
                poll = select.poll()
                poll.register(self._fd, select.POLLIN)
                ready = poll.poll(0)
                if not ready:
                    break
                piece = os.read(self._fd, READ_BYTES)
                if not piece:
                    if ready[0][1] & ~select.POLLIN or not got:
                        raise LineLost(f"{self.port} has vanished: unplugged, or its other end is closed")
                    break
                got += piece
                if ready[0][1] & ~select.POLLIN:
                    break
        except BlockingIOError:
            pass
        except OSError as error:
            raise self._lost(error) from None
        return bytes(got)

    def write(self, data: bytes, *, first: bool = False) -> int:
        """Send bytes, or keep what the port does not take yet for the next call; returns how many are kept.

        With `first`, what was kept is dropped, and these go ahead of it.
        """
        if first:
            self._waiting.clear()
            with suppress(OSError, termios.error):
                termios.tcflush(self._fd, termios.TCOFLUSH)
        self._waiting += data
        try:
            while self._waiting:
                del self._waiting[: os.write(self._fd, self._waiting)]
        except BlockingIOError:
            pass
        except OSError as error:
            raise self._lost(error) from None
        return len(self._waiting)

    def close(self) -> None:
        """Let go of the port, after giving what is kept DRAIN_TRIES moments to leave; harmless when called twice."""
        for _ in range(DRAIN_TRIES):
            if self._serial is None or not self._waiting:
                break
            with suppress(LineLost, OSError):
                select.select([], [self._fd], [], DRAIN_S)
                self.write(b"")
        port, self._serial, self._fd = self._serial, None, -1
        self._waiting.clear()
        if port is not None:
            with suppress(OSError, termios.error):
                fcntl.ioctl(port.fileno(), termios.TIOCNXCL)
            with suppress(OSError, termios.error):
                port.close()

    def _lost(self, error: OSError) -> LineLost:
        return LineLost(f"{self.port} has vanished: {error.strerror or error}")


def _cannot_open(port: str, baud: int, error: Exception) -> Faults:
    """Why a port could not be opened, and what to do about it."""
    number = getattr(error, "errno", None)
    if number is None and isinstance(error, termios.error) and error.args:
        number = error.args[0]
    if number == errno.ENOENT or not os.path.exists(port):
        found = [p.path for p in ports_found()]
        hint = "ports found: " + ", ".join(found) if found else "no port was found: is the board plugged in, and has it power?"
        return fault(port, "no such port", "the path of a serial port", hint)
    if number in (errno.EACCES, errno.EPERM):
        return fault(port, "you may not use this port", hint=_permission(port))
    if number in (errno.EBUSY, errno.EAGAIN):
        return fault(port, "the port is busy: another program holds it", hint="end that program, then try again")
    if isinstance(error, ValueError) or number == errno.EINVAL:
        return fault(port, f"the port cannot do {baud} baud", hint="try 115200, or another rate that the board can do")
    if number in (errno.ENOTTY, errno.EISDIR, errno.ENODEV, errno.ENXIO, errno.EIO) or not _is_terminal(port):
        return fault(port, "this is no serial port, or nothing is plugged into it", "the path of a serial port")
    return fault(port, f"the port cannot be opened: {error}")


def _is_terminal(port: str) -> bool:
    try:
        handle = os.open(port, os.O_RDONLY | os.O_NONBLOCK | os.O_NOCTTY)
    except OSError:
        return False
    try:
        return os.isatty(handle)
    finally:
        os.close(handle)


def _permission(port: str) -> str:
    """Who may use a port, and how to become one of them."""
    group = "dialout"
    with suppress(OSError, KeyError):
        group = grp.getgrgid(os.stat(port).st_gid).gr_name
    if group == "root":
        return (
            "it belongs to root alone: a udev rule such as "
            'SUBSYSTEM=="tty", MODE="0660", GROUP="dialout" in /etc/udev/rules.d/50-serial.rules opens it to a group'
        )
    return f"it belongs to the group '{group}': join it with 'sudo usermod -aG {group} $USER' and log in again"
