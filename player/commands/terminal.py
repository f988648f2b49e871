"""What is asked of a terminal: whether there is one, whether its keys come here, and that they come one by one."""

import contextlib
import os
import select
import sys
import textwrap
from collections.abc import Iterator


def is_terminal(stream: object) -> bool:
    """Whether a stream is one."""
    try:
        return stream is not None and os.isatty(stream.fileno())
    except (OSError, ValueError, AttributeError):
        return False


def folded(line: str, stream: object) -> str:
    """A line for a stream; on a terminal that it is too long for it is broken between words."""
    if not is_terminal(stream):
        return line
    width = os.get_terminal_size(stream.fileno()).columns
    return line if len(line) <= width else textwrap.fill(line, max(width, 20), break_long_words=False, break_on_hyphens=False)


def in_foreground() -> bool:
    """Whether keys come to this program."""
    try:
        return os.tcgetpgrp(sys.stdin.fileno()) == os.getpgrp()
    except OSError:
        return False


def is_screen() -> bool:
    """Whether stderr is a terminal on which something can live."""
    return is_terminal(sys.stderr) and os.environ.get("TERM") != "dumb"


def has_keys() -> bool:
    """Whether there are keys, and they come to this program."""
    return is_terminal(sys.stdin) and in_foreground()


@contextlib.contextmanager
def keys_at_once(wanted: bool) -> Iterator[None]:
    """Keys come one by one and are not shown; signals by key stay."""
    if not wanted:
        yield
        return
    import termios
    import tty

    handle = sys.stdin.fileno()
    was = termios.tcgetattr(handle)
    try:
        tty.setcbreak(handle, termios.TCSANOW)
        yield
    finally:
        with contextlib.suppress(OSError, termios.error):
            termios.tcsetattr(handle, termios.TCSANOW, was)


MOST_TYPED = 256


def typed(patience_s: float) -> bytes | None:
    """Keys as they come within so long; None where none does, b"" where the terminal is gone."""
    try:
        ready, _, _ = select.select([sys.stdin], [], [], patience_s)
        return os.read(sys.stdin.fileno(), MOST_TYPED) if ready else None
    except (OSError, ValueError):
        return b""


def letters(keys: bytes) -> str:
    """The keys that were typed. An arrow or function key begins with Escape too, but more follows at once: it is none of them,
    so that no slip of the cursor keys vents."""
    return "" if len(keys) > 1 and keys[:1] == b"\x1b" else keys.decode(errors="replace").lower()
