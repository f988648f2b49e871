"""All processes and threads of the compose window: its workers, and the hand that waits for the disk.

Nothing here computes. What a worker says, and what the disk has come to, arrive as signals on the window's own thread.
"""

import os
import queue
import subprocess
import sys
import threading
from collections.abc import Callable
from typing import Any

from PySide6.QtCore import QObject, Signal

from composer.editor import framing


class Worker(QObject):
    """One worker process. It ends when this does, even by kill -9: it then finds its input closed.

    said: a message of the worker; ended: it has gone without being told to, with its exit code
    """

    said = Signal(object)
    ended = Signal(int)
    _arrived = Signal(int, object)
    _closed = Signal(int, int)

    def __init__(self, role: str, parent: QObject | None = None):
        super().__init__(parent)
        self.role = role
        self._number = 0
        self._process: subprocess.Popen | None = None
        self._out: queue.SimpleQueue = queue.SimpleQueue()
        self._arrived.connect(self._hand_on)
        self._closed.connect(self._is_closed)

    @property
    def number(self) -> int:
        """How many times it was started."""
        return self._number

    @property
    def runs(self) -> bool:
        """Whether there is a process."""
        return self._process is not None

    @property
    def process_id(self) -> int:
        """The process's id, 0 for none."""
        return self._process.pid if self._process is not None else 0

    def start(self) -> None:
        """Start the process, in place of one that runs."""
        self.stop()
        self._number += 1
        environment = {**os.environ, "OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1"}
        self._process = subprocess.Popen(
            [sys.executable, "-P", "-m", "composer.editor.worker", self.role],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            bufsize=0,
            env=environment,
            creationflags=getattr(subprocess, "CREATE_NO_WINDOW", 0),
        )
        self._out = queue.SimpleQueue()
        for does in (self._read, self._write):
            threading.Thread(target=does, args=(self._process, self._number, self._out), daemon=True).start()

    def send(self, message: Any) -> None:
        """Send a message; never waits."""
        self._out.put(message)

    def stop(self) -> None:
        """End the process at once. What it still had to say is not heard."""
        process, self._process = self._process, None
        if process is not None:
            self._number += 1
            self._out.put(None)
            process.kill()
            threading.Thread(target=process.wait, daemon=True).start()

    def _read(self, process: subprocess.Popen, number: int, _: queue.SimpleQueue) -> None:
        try:
            framing.each(process.stdout, lambda message: self._arrived.emit(number, message))
            self._closed.emit(number, process.wait())
        except RuntimeError:
            # The window has gone, and this object with it.
            return

    def _write(self, process: subprocess.Popen, _: int, out: queue.SimpleQueue) -> None:
        while (message := out.get()) is not None:
            try:
                framing.write(process.stdin, message)
            except (OSError, ValueError):
                return

    def _hand_on(self, number: int, message: Any) -> None:
        if number == self._number:
            self.said.emit(message)

    def _is_closed(self, number: int, code: int) -> None:
        if number == self._number and self._process is not None:
            self._process = None
            self.ended.emit(code)


class Later(QObject):
    """One thread that does what has to wait for the disk, in order."""

    _done = Signal(object, object, object)

    def __init__(self, parent: QObject | None = None):
        super().__init__(parent)
        self._jobs: queue.SimpleQueue = queue.SimpleQueue()
        self._open = 0
        self._done.connect(self._hand_on)
        threading.Thread(target=self._run, daemon=True).start()

    @property
    def busy(self) -> bool:
        """Whether something is still to be done, or its end to be told."""
        return self._open > 0

    def do(self, job: Callable[[], Any], then: Callable[[Any, Exception | None], None] | None = None) -> None:
        """Do it later; `then` hears, on this thread, what it returned or raised."""
        self._open += 1
        self._jobs.put((job, then))

    def end(self) -> None:
        """Take no more jobs."""
        self._jobs.put(None)

    def _run(self) -> None:
        while (each := self._jobs.get()) is not None:
            job, then = each
            result, wrong = None, None
            try:
                result = job()
            except Exception as error:
                wrong = error
            try:
                self._done.emit(then, result, wrong)
            except RuntimeError:
                return

    def _hand_on(self, then: Callable | None, result: Any, wrong: Exception | None) -> None:
        self._open -= 1
        if then is not None:
            then(result, wrong)
