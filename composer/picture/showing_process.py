"""The process beside the preview window: one job at a time, its messages on the window's own thread, ended when asked."""

import multiprocessing
import sys
from collections.abc import Callable
from multiprocessing.connection import Connection
from typing import Any

from PySide6.QtCore import QObject, QTimer, Signal

LOOK_MS = 25
MOST_AT_ONCE = 64
"""Messages taken between two frames."""


def _work(to_window: Connection, job: Callable[..., None], given: tuple[Any, ...]) -> None:
    """Do a job in the process; a window that has gone ends it, and what goes wrong is told by the exit code alone."""
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

    def __init__(self, parent: QObject | None = None):
        super().__init__(parent)
        self._process: multiprocessing.process.BaseProcess | None = None
        self._from: Connection | None = None
        self._timer = QTimer(self)
        self._timer.setInterval(LOOK_MS)
        self._timer.timeout.connect(self._look)

    @property
    def busy(self) -> bool:
        """Whether a job is under way."""
        return self._process is not None

    def start(self, job: Callable[..., None], *given: Any) -> None:
        """Do `job(*given, tell)`, in place of one that runs."""
        self.stop()
        # A fresh interpreter: a forked one would have the window's own threads cut off in it.
        context = multiprocessing.get_context("spawn")
        self._from, to_window = context.Pipe(duplex=False)
        self._process = context.Process(target=_work, args=(to_window, job, given), daemon=True)
        self._process.start()
        to_window.close()
        self._timer.start()

    def stop(self) -> None:
        """End the job; what it still had to tell is not heard."""
        process, self._process = self._process, None
        self._timer.stop()
        if self._from is not None:
            self._from.close()
            self._from = None
        if process is not None:
            process.kill()
            process.join()

    def _look(self) -> None:
        for _ in range(MOST_AT_ONCE):
            listening = self._from
            if listening is None or not listening.poll():
                return
            try:
                message = listening.recv()
            except (EOFError, OSError):
                self._ended()
                return
            self.said.emit(message)

    def _ended(self) -> None:
        process, self._process = self._process, None
        self._timer.stop()
        if self._from is not None:
            self._from.close()
            self._from = None
        good = False
        if process is not None:
            process.join()
            good = process.exitcode == 0
        self.done.emit(good)
