"""The window's connection to a run: begun or attached to on a thread beside, heard and said without ever waiting."""

import threading
from collections.abc import Callable
from typing import Any

from PySide6.QtCore import QObject, Signal

from composer.faults import Faults
from player.engine.process.client import Client, NotThere, Stranger, Unreadable
from player.engine.process.layout import Snapshot
from player.engine.process.room import NoRoom

WRONG = (NotThere, Stranger, Unreadable, NoRoom, OSError, Faults)
"""What may go wrong on the way to a run; each says why, for the operator."""


class Link(QObject):
    """A run, or none yet, or none any more.

    came: attached, with the client alone, so that there is VENT at once; known: what the run is about, once that is read
    did_not_come: why not; heard: name and fields of something of TOLD; lost: the process is gone without its last message
    """

    came = Signal()
    known = Signal(object)
    did_not_come = Signal(str)
    heard = Signal(str, object)
    lost = Signal()
    _made = Signal(int, object, str)
    _read = Signal(int, object)

    def __init__(self, parent: QObject | None = None):
        super().__init__(parent)
        self.client: Client | None = None
        self.over = False
        self._number = 0
        self._made.connect(self._arrived)
        self._read.connect(self._is_known)

    @property
    def busy(self) -> bool:
        """Whether a run is on its way."""
        return self.client is None and self._number % 2 == 1

    def make(self, making: Callable[[], tuple[Client, Callable[[], Any]]]) -> None:
        """Have a run begun or attached to: `making` returns the client, and what reads the rest; both may take long."""
        self.leave()
        self._number += 1
        number = self._number

        # On a thread: a welcome may take seconds. And as threads run, the run's process is begun anew and not forked, so that
        # it holds no part of this window, and no connection to the screen.
        def work() -> None:
            try:
                (client, read), why = making(), ""
            except WRONG as wrong:
                client, read, why = None, None, str(wrong)
            try:
                self._made.emit(number, client, why)
                if read is not None:
                    self._read.emit(number, read())
            except RuntimeError:
                # The window has gone meanwhile.
                if client is not None:
                    client.leave()

        threading.Thread(target=work, name="to a run", daemon=True).start()

    def _arrived(self, number: int, client: Client | None, why: str) -> None:
        if number != self._number:
            if client is not None:
                client.leave()
            return
        self._number += 1
        if client is None:
            self.did_not_come.emit(why)
            return
        self.client, self.over = client, False
        self.came.emit()

    def _is_known(self, number: int, what: Any) -> None:
        if number + 1 == self._number and self.client is not None:
            self.known.emit(what)

    def look(self) -> None:
        """Hear what the run has said since."""
        client = self.client
        if client is None or self.over:
            return
        for name, fields in client.hear(0.0):
            if name in ("ended", "failed"):
                self.over = True
            self.heard.emit(name, fields)
        if client.gone and not self.over:
            self.over = True
            self.lost.emit()

    def say(self, name: str, /, **fields: Any) -> bool:
        """Say something to the run; whether it is on its way."""
        return self.client is not None and not self.over and self.client.say(name, **fields)

    @property
    def on(self) -> bool:
        """Whether a run is attached that has not ended."""
        return self.client is not None and not self.over

    def snapshot(self) -> Snapshot | None:
        """The run as it is now, or was last; None without one."""
        return None if self.client is None else self.client.snapshot()

    def leave(self) -> None:
        """Let go of the run, which then goes by its rule; what is on its way is let go when it comes."""
        # By two, or one: what still comes of the run before has another number.
        self._number += 2 if self._number % 2 == 0 else 1
        if self.client is not None:
            self.client.leave()
            self.client = None
        self.over = False
