"""A hang view that is drawn on a thread beside: however long that takes, the window's own thread has time for keys."""

import queue
import threading
from collections.abc import Callable

from PySide6.QtCore import QElapsedTimer, QSize, Signal
from PySide6.QtGui import QCloseEvent, QImage, QPainter, QPaintEvent
from PySide6.QtWidgets import QWidget

from composer.limits.abilities import Abilities
from composer.picture.hang import paint as hang_paint
from composer.picture.hang.hang_view import HangView
from composer.picture.hang.names import paint_names
from composer.picture.look import painting
from composer.rig.model import Rig

Job = Callable[[], None]


class HangBeside(HangView):
    """As a hang view. cost_ms: what it last took to draw; frames: how many pictures there have been"""

    _drawn = Signal(int, object, object, float)

    def __init__(self, rig: Rig, abilities: Abilities, parent: QWidget | None = None):
        self._picture: QImage | None = None
        self._key: tuple | None = None
        self._asked = self._busy = 0
        self.cost_ms, self.frames = 0.0, 0
        self._jobs: queue.SimpleQueue[Job | None] = queue.SimpleQueue()
        super().__init__(rig, abilities, parent)
        self._drawn.connect(self._take)
        threading.Thread(target=_work, args=(self._jobs,), name="draws the fibers", daemon=True).start()

    def paintEvent(self, event: QPaintEvent) -> None:
        """The latest picture; the next one is begun where it would be another."""
        width, height = self._size()
        if self._still is None or self._picture is None or self._picture.size() != QSize(width, height):
            # Another size, view or look: once, at once. What is still being drawn is of no use any more.
            self._asked += 1
            self._busy = 0
            super().paintEvent(event)
            self._picture = self._still.copy() if self._still is not None else None
            self._key = None
            self._begin(width, height)
            return
        self._begin(width, height)
        with painting(self) as painter:
            ratio = self.devicePixelRatioF()
            painter.scale(1.0 / ratio, 1.0 / ratio)
            painter.drawImage(0, 0, self._picture)

    def _moved(self) -> None:
        """The next picture is begun at once; the window is drawn anew when it is there, once and not twice."""
        width, height = self._size()
        there = self._still is not None and self._picture is not None and self._picture.size() == QSize(width, height)
        if there and self.isVisible():
            self._begin(width, height)
        else:
            self.update()

    def _begin(self, width: int, height: int) -> None:
        key = (id(self._wanted), id(self._sensed), self._lit, self._hovered, self._camera)
        if self._busy or key == self._key or self._still is None:
            return
        self._key = key
        self._asked += 1
        self._busy = number = self._asked
        room, camera, look, still = self._room, self._seen(), self._look(), self._still
        wanted, sensed, lit, hovered = self._wanted, self._sensed, self._lit, self._hovered

        def draw() -> None:
            clock = QElapsedTimer()
            clock.start()
            picture = still.copy()
            painter = QPainter(picture)
            try:
                lines = hang_paint.paint_fibers(painter, room, camera, look, wanted, sensed, lit)
                paint_names(painter, room, camera, lines, look, hovered, width)
            finally:
                painter.end()
            self._drawn.emit(number, picture, lines, clock.nsecsElapsed() / 1e6)

        self._jobs.put(draw)

    def _take(self, number: int, picture: QImage, lines, cost_ms: float) -> None:
        self.cost_ms = cost_ms
        if number != self._busy:
            return
        self._busy = 0
        self._picture, self._lines = picture, lines
        self.frames += 1
        self.update()

    def end(self) -> None:
        """No more is drawn."""
        self._jobs.put(None)

    def closeEvent(self, event: QCloseEvent) -> None:
        """Nothing is drawn behind a closed window."""
        self.end()
        super().closeEvent(event)


def _work(jobs: "queue.SimpleQueue[Job | None]") -> None:
    while (job := jobs.get()) is not None:
        try:
            job()
        except RuntimeError:
            # The view has gone meanwhile.
            return
