"""A button that does its deed once it has been held for a second, by mouse or key, with the second shown."""

from PySide6.QtCore import QElapsedTimer, QRectF, Qt, QTimer, Signal
from PySide6.QtGui import QFocusEvent, QKeyEvent, QMouseEvent, QPainter, QPaintEvent
from PySide6.QtWidgets import QPushButton, QWidget

from composer.picture.look import colour, painting
from composer.picture.palette import DARK, Theme

HELD_MS = 1000
FRAME_MS = 25


class HoldButton(QPushButton):
    """done: it was held for the second; a release before then does nothing."""

    done = Signal()

    def __init__(self, word: str, parent: QWidget | None = None):
        super().__init__(word, parent)
        self.theme: Theme = DARK
        self._since = QElapsedTimer()
        self._holding = False
        self._timer = QTimer(self)
        self._timer.setInterval(FRAME_MS)
        self._timer.setTimerType(Qt.TimerType.PreciseTimer)
        self._timer.timeout.connect(self._look)

    @property
    def share(self) -> float:
        """How much of the second has been held."""
        return min(1.0, self._since.elapsed() / HELD_MS) if self._holding else 0.0

    def begin(self) -> None:
        """It is held from now on."""
        if self.isEnabled() and not self._holding:
            self._holding = True
            self._since.start()
            self._timer.start()
            self.update()

    def end(self) -> None:
        """It is let go."""
        self._holding = False
        self._timer.stop()
        self.update()

    def _look(self) -> None:
        if not self.isEnabled():
            self.end()
        elif self.share >= 1.0:
            self.end()
            self.done.emit()
        self.update()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Held by the mouse."""
        if event.button() == Qt.MouseButton.LeftButton:
            self.begin()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Let go by the mouse."""
        self.end()

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """A pointer that leaves the button lets go of it."""
        if not self.rect().contains(event.position().toPoint()):
            self.end()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Held by Enter, while it has the focus."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            if not event.isAutoRepeat():
                self.begin()
        elif event.key() != Qt.Key.Key_Space:
            super().keyPressEvent(event)

    def keyReleaseEvent(self, event: QKeyEvent) -> None:
        """Let go by key; a key that repeats itself is still held."""
        if not event.isAutoRepeat():
            self.end()

    def focusOutEvent(self, event: QFocusEvent) -> None:
        """Without the focus nothing is held."""
        self.end()
        super().focusOutEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """The button, and along its foot how much of the second has gone."""
        super().paintEvent(event)
        if self._holding:
            with painting(self) as painter:
                painter.setRenderHint(QPainter.RenderHint.Antialiasing)
                painter.setPen(Qt.PenStyle.NoPen)
                painter.setBrush(colour(self.theme.caution, 90))
                painter.drawRect(QRectF(0, 0, self.width() * self.share, self.height()))
                painter.setBrush(colour(self.theme.caution))
                high = max(4.0, self.height() / 9)
                painter.drawRect(QRectF(0, self.height() - high, self.width() * self.share, high))
