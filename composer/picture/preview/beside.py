"""The process beside the preview window: one job at a time, its messages on the window's own thread, ended when asked."""

import multiprocessing
import os
import sys
import threading
from collections.abc import Callable
from contextlib import suppress
from multiprocessing.connection import Connection
from typing import Any

from PySide6.QtCore import QObject, Signal

NICENESS = 5


def _work(to_window: Connection, job: Callable[..., None], given: tuple[Any, ...]) -> None:
    """Do a job in the process; a window that has gone ends it, and what goes wrong is told by the exit code alone."""
    # Windows, and a run that plays meanwhile, have their turn first; some systems have no such thing.
    with suppress(AttributeError, OSError):
        os.nice(NICENESS)
    try:
        job(*given, to_window.send)
    except BaseException:
        sys.exit(1)
    finally:
        to_window.close()


class Beside(QObject):
    """Does one job in a process of its own.

    said: what the job tells; done: it has ended, by itself (True) or before its time (False)
    """

    said = Signal(object)
    done = Signal(bool)
    _arrived = Signal(int, object)
    _closed = Signal(int, bool)

    def __init__(self, parent: QObject | None = None):
        super().__init__(parent)
        self._process: multiprocessing.process.BaseProcess | None = None
        self._number = 0
        self._arrived.connect(self._hand_on)
        self._closed.connect(self._ended)

    @property
    def busy(self) -> bool:
        """Whether a job is under way."""
        return self._process is not None

    def start(self, job: Callable[..., None], *given: Any) -> None:
        """Do `job(*given, tell)`, in place of one that runs."""
        self.stop()
        # A fresh interpreter: a forked one would have the window's own threads cut off in it.
        context = multiprocessing.get_context("spawn")
        listening, to_window = context.Pipe(duplex=False)
        self._process = context.Process(target=_work, args=(to_window, job, given), daemon=True)
        self._process.start()
        to_window.close()
        # A long message takes as long as the process takes to send it: the window's thread does not wait for that.
        threading.Thread(target=self._listen, args=(listening, self._process, self._number), daemon=True).start()

    def stop(self) -> None:
        """End the job; what it still had to tell is not heard."""
        process, self._process = self._process, None
        self._number += 1
        if process is not None:
            process.kill()

    def _listen(self, listening: Connection, process: multiprocessing.process.BaseProcess, number: int) -> None:
        """Hand on all that a process tells, until it has gone; in a thread of its own."""
        try:
            with listening, suppress(EOFError, OSError):
                while True:
                    self._arrived.emit(number, listening.recv())
            process.join()
            self._closed.emit(number, process.exitcode == 0)
        except RuntimeError:
            # The window has gone, and this object with it.
            process.join()

    def _hand_on(self, number: int, message: object) -> None:
        if number == self._number:
            self.said.emit(message)

    def _ended(self, number: int, good: bool) -> None:
        if number == self._number:
            self._process = None
            self.done.emit(good)
