"""The worker process: messages in on its input, messages out on its output, a desk between them.

Started as `python -m composer.editor.worker ROLE`. It ends when its input does, whatever became of the window.
"""

import os
import queue
import signal
import sys
import threading
import time
from contextlib import suppress
from typing import Any, BinaryIO

from composer.editor import framing
from composer.editor.desk import SOLVER, Desk, own_fault
from composer.editor.memory import Tidy, give_back
from composer.editor.messages import Again, Ask, Changed, Failed, Whole

NICE = 5
"""How far the solver steps back for the window and the reader, where the system knows of such a thing."""

LONG_S = 0.3
"""A step that takes so long is one of a large score, whose arrays leave much memory free that is nobody's any more."""


def serve(role: str, into: BinaryIO, out: BinaryIO) -> None:
    """Work until `into` ends."""
    heard: queue.SimpleQueue = queue.SimpleQueue()
    # Texts that have come and are not yet taken up: a plain count, as only one thread adds and only one takes away.
    waiting = _Count()

    def listen() -> None:
        framing.each(into, lambda message: (waiting.came(message), heard.put(message)))
        heard.put(None)

    threading.Thread(target=listen, daemon=True).start()
    desk = Desk(role, lambda message: framing.write(out, message), lambda: waiting.texts > 0, time.perf_counter)
    busy, tidy = False, Tidy()
    while True:
        try:
            message = heard.get(block=not busy)
        except queue.Empty:
            message = Ellipsis
        if message is None:
            return
        try:
            if message is not Ellipsis:
                waiting.went(message)
                desk.hear(message)
                busy = True
                # All that has come is taken in before anything is done about it.
                if not heard.empty():
                    continue
            began = time.perf_counter()
            busy = desk.work()
            if time.perf_counter() - began > LONG_S:
                give_back()
            if not busy:
                tidy.at_rest()
        except OSError:
            return
        except Exception as error:
            busy = True
            desk.drop()
            framing.write(out, Failed(desk.version, own_fault(error)))


class _Count:
    def __init__(self) -> None:
        self._came = self._went = 0

    @property
    def texts(self) -> int:
        return self._came - self._went

    def came(self, message: Any) -> None:
        self._came += _is_text(message)

    def went(self, message: Any) -> None:
        self._went += _is_text(message)


def _is_text(message: Any) -> bool:
    return isinstance(message, (Whole, Changed, Again)) and not isinstance(message, Ask)


def main() -> None:
    """Take over standard input and output; whatever prints goes to the error stream instead."""
    with suppress(ValueError):
        # Ctrl-C in the terminal is for the window, which then ends this by closing its input.
        signal.signal(signal.SIGINT, signal.SIG_IGN)
    role = sys.argv[1]
    if role == SOLVER and hasattr(os, "nice"):
        with suppress(OSError):
            os.nice(NICE)
    into = os.fdopen(os.dup(0), "rb", buffering=0)
    out = os.fdopen(os.dup(1), "wb", buffering=0)
    os.dup2(2, 1)
    serve(role, into, out)


if __name__ == "__main__":
    main()
