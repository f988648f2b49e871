"""A plain window on a cloth: scroll, zoom, and a play head that runs over it."""

import sys

from PySide6.QtCore import QElapsedTimer, QPointF, QRectF, QSize, Qt, QTimer
from PySide6.QtGui import QImage, QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QResizeEvent, QWheelEvent
from PySide6.QtWidgets import QApplication, QWidget

from composer.picture import cloth, palette
from composer.picture.axes import say_seconds
from composer.picture.look import LEFT, colour, pen
from composer.picture.material import part
from composer.picture.scene import Scene

NARROWEST_S = 0.5
FRAME_MS = 33
FOOT = 18
"""Pixels, at scale 1, below the picture for the line that says where the head is and what the keys do."""

KEYS = "Space plays and pauses   ← → scroll   + − zoom   0 shows all   Home to the start   Esc closes"


class Viewer(QWidget):
    """The cloth of one scene. The picture is drawn when the stretch shown changes; the play head is laid over it."""

    def __init__(self, scene: Scene):
        super().__init__()
        self._whole = scene
        self._from_s, self._to_s = scene.from_s, scene.to_s
        self._head_s = scene.from_s
        self._picture: QImage | None = None
        self._clock = QElapsedTimer()
        self._timer = QTimer(self)
        self._timer.setInterval(FRAME_MS)
        self._timer.timeout.connect(self._run)
        self.setWindowTitle(f"{scene.title} - preview")
        self.setMinimumSize(640, 400)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)

    def sizeHint(self) -> QSize:
        """The size to open with."""
        return QSize(1280, 800)

    @property
    def shown(self) -> tuple[float, float]:
        """The stretch of time shown, in s."""
        return self._from_s, self._to_s

    @property
    def head_s(self) -> float:
        """Where the play head stands, in s."""
        return self._head_s

    @property
    def playing(self) -> bool:
        """Whether the play head runs."""
        return self._timer.isActive()

    def show_stretch(self, from_s: float, to_s: float) -> None:
        """Show a stretch of time, moved and shortened so that it lies within the whole."""
        whole = self._whole.to_s - self._whole.from_s
        length = min(max(to_s - from_s, min(NARROWEST_S, whole)), whole)
        begin = min(max(from_s, self._whole.from_s), self._whole.to_s - length)
        if (begin, begin + length) != (self._from_s, self._to_s):
            self._from_s, self._to_s = begin, begin + length
            self._picture = None
            self.update()

    def zoom(self, factor: float, about_s: float) -> None:
        """Show `factor` times as long a stretch; the instant `about_s` stays where it is."""
        self.show_stretch(about_s - (about_s - self._from_s) * factor, about_s + (self._to_s - about_s) * factor)

    def scroll(self, by_s: float) -> None:
        """Move the stretch shown."""
        length = self._to_s - self._from_s
        begin = min(max(self._from_s + by_s, self._whole.from_s), self._whole.to_s - length)
        self.show_stretch(begin, begin + length)

    def place_head(self, at_s: float) -> None:
        """Put the play head at an instant; it stays in view while it runs."""
        self._head_s = min(max(at_s, self._whole.from_s), self._whole.to_s)
        if self.playing and not self._from_s <= self._head_s <= self._to_s:
            self.scroll(self._head_s - self._from_s)
        self.update()

    def toggle(self) -> None:
        """Play from the head, from the start where it stands at the end, or pause."""
        if self.playing:
            self._timer.stop()
        else:
            if self._head_s >= self._whole.to_s:
                self.place_head(self._whole.from_s)
            self._clock.start()
            self._timer.start()
        self.update()

    def _run(self) -> None:
        self.place_head(self._head_s + self._clock.restart() / 1000.0)
        if self._head_s >= self._whole.to_s:
            self._timer.stop()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Lay the play head over the picture, which is drawn anew where it no longer fits."""
        scale = self.devicePixelRatioF()
        width, height = max(1, round(self.width() * scale)), max(1, round(self.height() * scale))
        plan = cloth.layout(width, height, len(self._whole.lanes))
        if self._picture is None or self._picture.size() != QSize(width, height):
            self._picture = QImage(width, height, QImage.Format.Format_RGB32)
            inner = QPainter(self._picture)
            shown = part(self._whole, self._from_s, self._to_s, plan.width)
            inner.fillRect(0, 0, width, height, colour(palette.GROUND))
            cloth.paint(inner, shown, width, height - plan.look.px(FOOT))
            inner.end()
        painter = QPainter(self)
        painter.drawImage(QRectF(0, 0, self.width(), self.height()), self._picture)
        painter.scale(1 / scale, 1 / scale)
        self._paint_head(painter, plan, height)
        painter.end()

    def _paint_head(self, painter: QPainter, plan: cloth.Layout, height: int) -> None:
        look = plan.look
        if self._from_s <= self._head_s <= self._to_s:
            x = plan.left + (self._head_s - self._from_s) / (self._to_s - self._from_s) * plan.width
            painter.setPen(pen(palette.INK, look.px(2)))
            painter.drawLine(QPointF(x, plan.strip_top), QPointF(x, height - look.px(FOOT + 64)))
        bar = self._whole.tempo.say_place(self._head_s)
        word = f"{'playing' if self.playing else 'paused'} at {bar}, {say_seconds(self._head_s, 1)}    {KEYS}"
        box = QRectF(look.px(16), height - look.px(FOOT), self.width() * self.devicePixelRatioF() - look.px(32), look.px(13))
        look.write(painter, box, word, 10.5, palette.QUIET_INK, LEFT)

    def _time_at(self, x: float) -> float:
        scale = self.devicePixelRatioF()
        plan = cloth.layout(round(self.width() * scale), round(self.height() * scale), len(self._whole.lanes))
        return self._from_s + (x * scale - plan.left) / plan.width * (self._to_s - self._from_s)

    def wheelEvent(self, event: QWheelEvent) -> None:
        """The wheel zooms about the pointer; sideways, or with Shift, it scrolls."""
        turn = event.angleDelta()
        if turn.x() or event.modifiers() & Qt.KeyboardModifier.ShiftModifier:
            self.scroll(-(turn.x() or turn.y()) / 1200.0 * (self._to_s - self._from_s))
        else:
            self.zoom(0.85 ** (turn.y() / 120.0), self._time_at(event.position().x()))

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """A press puts the play head there."""
        if event.button() == Qt.MouseButton.LeftButton:
            self.place_head(self._time_at(event.position().x()))

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Dragging takes the play head along."""
        if event.buttons() & Qt.MouseButton.LeftButton:
            self.place_head(self._time_at(event.position().x()))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Everything that the mouse does, by key."""
        length = self._to_s - self._from_s
        does = {
            Qt.Key.Key_Space: self.toggle,
            Qt.Key.Key_Left: lambda: self.scroll(-length / 8),
            Qt.Key.Key_Right: lambda: self.scroll(length / 8),
            Qt.Key.Key_Plus: lambda: self.zoom(0.7, self._middle()),
            Qt.Key.Key_Equal: lambda: self.zoom(0.7, self._middle()),
            Qt.Key.Key_Minus: lambda: self.zoom(1 / 0.7, self._middle()),
            Qt.Key.Key_0: lambda: self.show_stretch(self._whole.from_s, self._whole.to_s),
            Qt.Key.Key_Home: lambda: (self.place_head(self._whole.from_s), self.scroll(-self._whole.to_s)),
            Qt.Key.Key_Escape: self.close,
        }.get(event.key())
        if does is None:
            super().keyPressEvent(event)
        else:
            does()

    def _middle(self) -> float:
        """What zooming by key keeps in place: the play head where it is in view, else the middle."""
        return self._head_s if self._from_s <= self._head_s <= self._to_s else (self._from_s + self._to_s) / 2

    def resizeEvent(self, event: QResizeEvent) -> None:
        """A new size wants a new picture."""
        self._picture = None


def show(scene: Scene) -> int:
    """Show a scene in a window until it is closed; returns 0."""
    application = QApplication.instance() or QApplication(sys.argv[:1])
    viewer = Viewer(scene)
    viewer.show()
    application.exec()
    return 0
