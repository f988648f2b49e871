"""The terminal while a score plays: one line that lives, and keys. On a thread of its own, so that a slow or stopped terminal
never holds up the engine."""

import contextlib
import os
import select
import sys
import threading
from collections import deque
from collections.abc import Callable
from typing import Any

from player.commands.shown import status_of
from player.commands.terminal import folded, has_keys, is_screen, keys_at_once, letters, typed
from player.engine.process.layout import Snapshot
from player.engine.status import Status

REFRESH_S = 0.1
KEYS = {
    "\n": "go_on",
    "\r": "go_on",
    " ": "pause",
    "p": "pause",
    "n": "next_cue",
    "r": "rest",
    "b": "bring_back",
    "d": "detach",
    "v": "vent",
    "\x1b": "vent",
}
"""What each key asks of the engine; pause and go_on take turns on the same key."""

KEYS_SAID = "Return goes on, space pauses, n next cue, r rest, v or Escape vent, d leaves, Ctrl-C rest, twice vent"

_COLOURS = {"playing": "32", "paused": "33", "resting": "33", "vented": "31", "lost": "31", "fault": "31"}


def live_line(status: Status, place: str, colour: bool, width: int) -> str:
    """The one line: state, place, cue, seconds left, fibers moving, links, late ticks; no wider than `width`."""
    state = status.state if status.phase != "bringing" else "moving to place"
    if status.waiting:
        state = f'waiting at "{status.waiting}", Return goes on'
    parts = [state, f"bar {place}" if ":" in place else place]
    if status.cue and not status.waiting:
        parts.append(f'"{status.cue}"')
    if status.next_cue:
        parts.append(f'next "{status.next_cue}"')
    left = max(0.0, status.duration_s - status.position_s)
    parts += [f"{left:.0f} s left", f"{status.moving} moving"]
    if status.let_down:
        parts.append(f"{status.let_down} let down")
    parts += [link_of(status), f"{status.late_ticks} late"]
    line = "  ".join(parts)
    line = line if len(line) <= width else line[: max(0, width - 1)] + "…"
    code = _COLOURS.get(status.state)
    return f"\x1b[{code}m{state}\x1b[0m{line[len(state) :]}" if colour and code and line.startswith(state) else line


def link_of(status: Status) -> str:
    """Every board's state, in one word where they agree."""
    states = {state for _, state in status.links}
    if len(states) == 1:
        return f"link {states.pop()}"
    return "links " + " ".join(f"{driver}:{state}" for driver, state in status.links)


class Front:
    """Shows the latest snapshot on stderr and hands on what keys ask for. Without a terminal it only prints what is told."""

    def __init__(self, ask: Callable[[str], object], about: dict[str, Any], quiet: bool = False):
        """about: what the run is, as it says itself."""
        self._ask, self._about, self._quiet = ask, about, quiet
        self._latest: Status | None = None
        self._place = ""
        self._told: deque[str] = deque(maxlen=1000)
        self._ends = threading.Event()
        self._lives = not quiet and is_screen()
        self._colour = self._lives and not os.environ.get("NO_COLOR")
        self._keys = has_keys()
        self._thread: threading.Thread | None = None

    def show(self, snapshot: Snapshot, inputs: dict[str, Any]) -> None:
        """The latest of the run; inputs are shown on the screen of a live session alone."""
        self._place, self._latest = snapshot.text("place"), status_of(snapshot, self._about)

    def tell(self, lines: tuple[str, ...]) -> None:
        """Lines for the operator."""
        self._told.extend(lines)

    def __enter__(self) -> "Front":
        if self._lives and self._keys:
            print(KEYS_SAID, file=sys.stderr)
        self._thread = threading.Thread(target=self._live, name="front", daemon=True)
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._ends.set()
        if self._thread is not None:
            self._thread.join(timeout=1.0)

    def _live(self) -> None:
        with keys_at_once(self._keys):
            while not self._ends.is_set():
                self._draw()
                self._listen()
            self._draw()
            if self._lives:
                self._write("\n")

    def _listen(self) -> None:
        """Wait for a key, or until the line wants drawing anew."""
        if not self._keys:
            self._ends.wait(REFRESH_S)
            return
        keys = typed(REFRESH_S)
        if keys is None:
            return
        if not keys:
            # The terminal is gone; the signal that says so stops the run.
            self._keys = False
        for key in letters(keys):
            asks = KEYS.get(key)
            paused = self._latest is not None and self._latest.state == "paused"
            if asks == "pause" and paused:
                asks = "go_on"
            if asks and not (asks == "go_on" and not paused):
                self._ask(asks)

    def _draw(self) -> None:
        while self._told:
            said = self._told.popleft()
            if not self._quiet:
                self._write(("\r\x1b[K" if self._lives else "") + folded(said, sys.stderr) + "\n")
        if self._lives and self._latest is not None:
            width = _width()
            self._write("\r\x1b[K" + live_line(self._latest, self._place, self._colour, width))

    def _write(self, text: str) -> None:
        with contextlib.suppress(OSError, ValueError):
            sys.stderr.write(text)
            sys.stderr.flush()


def ask_to_arm(is_there: Callable[[], bool]) -> bool:
    """Ask for `arm` to be typed; False for any other answer, or none at all, or where the run `is_there` no more."""
    print("The boards are ready. Type 'arm' to let the fibers move, anything else to leave it: ", end="", file=sys.stderr)
    sys.stderr.flush()
    answer = b""
    while not answer.endswith(b"\n") and len(answer) < 256 and is_there():
        ready, _, _ = select.select([sys.stdin], [], [], 0.1)
        if ready:
            more = os.read(sys.stdin.fileno(), 256)
            if not more:
                break
            answer += more
    return answer.decode(errors="replace").strip().lower() == "arm"


def _width() -> int:
    try:
        return max(20, os.get_terminal_size(sys.stderr.fileno()).columns - 1)
    except OSError:
        return 79
