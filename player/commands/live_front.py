"""The terminal of a live session: the screen that lives, and keys. On a thread of its own, so that a slow or stopped terminal
never holds up the engine. Without a terminal it only prints what is told."""

import contextlib
import os
import sys
import threading
from collections import deque
from collections.abc import Callable
from typing import Any

from player.commands.shown import meters_for, scene_of
from player.commands.terminal import has_keys, is_screen, keys_at_once, letters, typed
from player.engine.clock import SteadyClock
from player.engine.process.layout import Snapshot
from player.live.hold_key import HoldKey
from player.live.screen import Scene, frame

REFRESH_S = 0.1
SLIVER_S = 0.001
MOST_TOLD = 200
SMALLEST = (40, 12)
"""Columns and lines below which there is no screen, only a line that says so."""

KEYS = {
    "a": "bring_back",
    "b": "bring_back",
    "r": "rest",
    "v": "vent",
    "\x1b": "vent",
    " ": "pause",
    "p": "pause",
    "\n": "go_on",
    "\r": "go_on",
    "n": "next_cue",
    "l": "let_go",
    "d": "detach",
    "t": "record",
}
"""What each key asks for; pause and go_on take turns on the same key, `h` is the hold-to-run."""

HOLD = "h"


class LiveFront:
    """Shows the latest scene on stderr and hands on what keys ask for.

    ask: called from the front's own thread with what a key asks for, "hold" and "held" for the hold-to-run
    """

    def __init__(self, ask: Callable[[str], object], about: dict[str, Any], quiet: bool = False):
        """about: what the session is, as it says itself."""
        self._ask, self._about, self._quiet = ask, about, quiet
        self._now, self._meters = SteadyClock().now, meters_for(about)
        self._scene: Scene | None = None
        self._told: deque[str] = deque(maxlen=MOST_TOLD)
        self._unsaid: deque[str] = deque(maxlen=1000)
        self._ends = threading.Event()
        self._lives = not quiet and is_screen()
        self._colour = self._lives and not os.environ.get("NO_COLOR")
        self._keys = has_keys()
        self._hold = HoldKey()
        self._shown: list[str] = []
        self._size = (0, 0)
        self._thread: threading.Thread | None = None

    def tell(self, said: tuple[str, ...]) -> None:
        """Something for the operator."""
        self._told.extend(said)
        self._unsaid.extend(said)

    def show(self, snapshot: Snapshot, inputs: dict[str, Any]) -> None:
        """The latest of the session, and of its inputs."""
        self._scene = scene_of(snapshot, self._about, inputs, tuple(self._told), self._now())

    def __enter__(self) -> "LiveFront":
        if self._lives:
            self._write("\x1b[?1049h\x1b[?25l\x1b[2J")
        self._thread = threading.Thread(target=self._live, name="front", daemon=True)
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._ends.set()
        if self._thread is not None:
            self._thread.join(timeout=1.0)
        if self._lives:
            self._write("\x1b[?25h\x1b[?1049l")
            for said in list(self._told)[-20:]:
                self._write(said + "\n")

    def _live(self) -> None:
        with keys_at_once(self._keys):
            while not self._ends.is_set():
                self._draw()
                self._listen()
            self._draw()

    def _listen(self) -> None:
        if not self._keys:
            self._ends.wait(REFRESH_S)
            return
        keys = typed(self._patience_s())
        if keys is not None and not keys:
            # The terminal is gone; the signal that says so stops the run.
            self._keys = False
        self._typed(keys or b"")
        if self._hold.is_up(self._now()):
            self._ask("held")
        elif self._hold.down:
            # Said again and again: one that is not is up, whatever has become of this terminal.
            self._ask("hold")

    def _patience_s(self) -> float:
        """How long to wait for a key: until the screen is due, or until one that is held would be up."""
        if not self._hold.down:
            return REFRESH_S
        return min(REFRESH_S, max(self._hold.until_s - self._now(), 0.0) + SLIVER_S)

    def _typed(self, keys: bytes) -> None:
        for key in letters(keys):
            if key == HOLD:
                if self._hold.pressed(self._now()):
                    self._ask("hold")
                continue
            asks = KEYS.get(key)
            paused = self._scene is not None and self._scene.status.state == "paused"
            if asks == "pause" and paused:
                asks = "go_on"
            if asks and not (asks == "go_on" and not paused):
                self._ask(asks)

    def _draw(self) -> None:
        if not self._lives:
            while self._unsaid:
                said = self._unsaid.popleft()
                if not self._quiet:
                    self._write(said + "\n")
            return
        if self._scene is None:
            return
        width, height = _size()
        if (width, height) != self._size:
            self._size, self._shown = (width, height), []
            self._write("\x1b[2J")
        if width < SMALLEST[0] or height < SMALLEST[1]:
            lines = [f"{self._scene.status.state}; wider, please"[:width]]
        else:
            lines = frame(self._scene, self._meters, width - 1, height, self._colour)
        # Only lines that have changed are written, all at once: nothing flickers.
        out = []
        for row, line in enumerate(lines):
            if row >= len(self._shown) or self._shown[row] != line:
                out.append(f"\x1b[{row + 1};1H{line}\x1b[K")
        self._shown = lines
        if out:
            self._write("".join(out))

    def _write(self, text: str) -> None:
        with contextlib.suppress(OSError, ValueError):
            sys.stderr.write(text)
            sys.stderr.flush()


def _size() -> tuple[int, int]:
    try:
        size = os.get_terminal_size(sys.stderr.fileno())
        return max(1, size.columns), max(1, size.lines)
    except OSError:
        return 80, 24
