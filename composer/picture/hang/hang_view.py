"""The hang view: fibers where they hang, moving; wanted as a ghost where sensed differs."""

from collections.abc import Collection

import numpy as np
from numpy.typing import ArrayLike, NDArray
from PySide6.QtCore import QPointF, QSize, Qt, Signal
from PySide6.QtGui import QImage, QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QResizeEvent, QWheelEvent
from PySide6.QtWidgets import QHBoxLayout, QPushButton, QWidget

from composer.limits.abilities import Abilities
from composer.picture import palette
from composer.picture.hang import paint as hang_paint
from composer.picture.hang.camera import VIEWS, Camera
from composer.picture.hang.names import paint_names
from composer.picture.look import Look
from composer.picture.palette import Theme
from composer.rig.model import Rig

Array = NDArray[np.float64]

NEAR_PX = 10.0
"""Pixels, at scale 1, from a fiber's line within which the pointer is on it."""

LARGEST, SMALLEST = 60.0, 0.5
"""How far one can zoom, as a share of the whole rig's picture."""


class HangView(QWidget):
    """Draws a rig's fibers where they hang. `show_strain` moves them; a click tells which fiber, and a hover its name.

    Keys, while it has the focus: F front, S side, T three-quarter, + and - zoom, 0 the whole rig, arrows move the picture.
    """

    fiber_clicked = Signal(int)
    """The index of the fiber that was clicked."""
    fiber_hovered = Signal(int)
    """The index of the fiber under the pointer, -1 for none."""
    view_changed = Signal(str)
    """The name of the view now shown: front, side or three-quarter."""

    def __init__(self, rig: Rig, abilities: Abilities, parent: QWidget | None = None, view: str = "front"):
        super().__init__(parent)
        self._theme = palette.DARK
        self._still: QImage | None = None
        self._camera: Camera | None = None
        self._own_camera = False
        self._lit: frozenset[int] = frozenset()
        self._hovered: int | None = None
        self._pressed: QPointF | None = None
        self._dragged = False
        self._lines: Array | None = None
        self.setMinimumSize(200, 140)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setMouseTracking(True)
        self.setAccessibleName("hang view")
        self.setAccessibleDescription("The fibers where they hang. F front, S side, T three-quarter, plus and minus zoom.")
        self._buttons: dict[str, QPushButton] = {}
        row = QHBoxLayout()
        row.setSpacing(2)
        row.addStretch(1)
        for name, each in VIEWS.items():
            button = QPushButton(each.word)
            button.setCheckable(True)
            button.setAccessibleName(f"see from: {each.word.lower()}")
            button.setToolTip(f"{each.word} ({each.key})")
            button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
            button.clicked.connect(lambda _=False, name=name: self.set_view(name))
            self._buttons[name] = button
            row.addWidget(button)
        row.addStretch(1)
        row.setContentsMargins(4, 4, 4, 4)
        self._row = QWidget(self)
        self._row.setLayout(row)
        self._view = view if view in VIEWS else "front"
        self._buttons[self._view].setChecked(True)
        self.set_rig(rig, abilities)

    def set_rig(self, rig: Rig, abilities: Abilities) -> None:
        """Draw another rig, all fibers at rest."""
        self._room = hang_paint.room_of(rig, abilities)
        self._wanted: Array = np.zeros(len(rig.fibers))
        self._sensed: Array | None = None
        self._hovered, self._lit = None, frozenset()
        self.show_all()

    def show_strain(self, wanted: ArrayLike, sensed: ArrayLike | None = None) -> None:
        """Move the fibers: strain (F,) wanted and, where it is known, sensed or simulated; nan in sensed: not known."""
        wanted = np.asarray(wanted, dtype=float)
        if wanted.shape != (len(self._room.names),):
            raise ValueError(f"{wanted.shape} strains for {len(self._room.names)} fibers")
        self._wanted = wanted
        self._sensed = None if sensed is None else np.asarray(sensed, dtype=float)
        self._moved()

    def _moved(self) -> None:
        """The fibers have moved: another picture of them is wanted."""
        self.update()

    @property
    def view(self) -> str:
        """The name of the view: front, side or three-quarter."""
        return self._view

    def set_view(self, view: str) -> None:
        """See the rig from the front, the side or three-quarter; the whole of it."""
        for name, button in self._buttons.items():
            button.setChecked(name == view)
        if view != self._view:
            self._view = view
            self.view_changed.emit(view)
        self.show_all()

    def light(self, fibers: Collection[int]) -> None:
        """Outline these fibers, and no others."""
        self._lit = frozenset(fibers)
        self.update()

    def show_all(self) -> None:
        """Have the whole rig in the picture."""
        self._own_camera = False
        self._drop()

    def zoom(self, factor: float, at: QPointF | None = None) -> None:
        """Draw it so many times as large; the point `at`, or the middle, stays where it is."""
        camera = self._seen()
        whole = hang_paint.camera_of(self._room, self._view, *self._size(), self._look()).scale
        factor = min(max(factor, SMALLEST * whole / camera.scale), LARGEST * whole / camera.scale)
        at = at or QPointF(self.width() / 2.0, self.height() / 2.0)
        ratio = self.devicePixelRatioF()
        self._set_camera(camera.zoomed(factor, at.x() * ratio, at.y() * ratio))

    def set_theme(self, theme: Theme) -> None:
        """Draw in these colours."""
        self._theme = theme
        self._drop()

    def sizeHint(self) -> QSize:
        """The size to open with."""
        return QSize(900, 500)

    def fiber_at(self, point: QPointF) -> int | None:
        """The fiber whose line lies at a point of the widget, None where none is near."""
        if self._lines is None or not len(self._lines):
            return None
        hanging = self._room.hanging
        at = np.array([point.x(), point.y()]) * self.devicePixelRatioF()
        begin, end = self._lines[:-1], self._lines[1:]
        joined = hanging.of[:-1] == hanging.of[1:]
        way = end - begin
        length = np.maximum((way**2).sum(axis=1), 1e-12)
        share = np.clip(((at - begin) * way).sum(axis=1) / length, 0.0, 1.0)
        away = np.hypot(*(begin + share[:, None] * way - at).T)
        away[~joined] = np.inf
        nearest = int(np.argmin(away))
        return int(hanging.of[nearest]) if away[nearest] <= NEAR_PX * self._look().scale else None

    def paintEvent(self, event: QPaintEvent) -> None:
        """Lay the fibers over what stands still, which is drawn anew only where the picture's frame changes."""
        width, height = self._size()
        look, camera = self._look(), self._seen()
        if self._still is None or self._still.size() != QSize(width, height):
            self._still = QImage(width, height, QImage.Format.Format_RGB32)
            inner = QPainter(self._still)
            hang_paint.paint_still(inner, self._room, camera, look, width, height)
            inner.end()
        painter = QPainter(self)
        ratio = self.devicePixelRatioF()
        painter.scale(1.0 / ratio, 1.0 / ratio)
        painter.drawImage(0, 0, self._still)
        self._lines = hang_paint.paint_fibers(painter, self._room, camera, look, self._wanted, self._sensed, self._lit)
        paint_names(painter, self._room, camera, self._lines, look, self._hovered, width)
        painter.end()

    def _size(self) -> tuple[int, int]:
        ratio = self.devicePixelRatioF()
        return max(1, round(self.width() * ratio)), max(1, round(self.height() * ratio))

    def _look(self) -> Look:
        window = self.window()
        ratio = self.devicePixelRatioF()
        return Look(max(1.0, min(window.width() * ratio / 1280.0, window.height() * ratio / 800.0)), self._theme)

    def _seen(self) -> Camera:
        if self._camera is None:
            self._camera = hang_paint.camera_of(self._room, self._view, *self._size(), self._look())
        return self._camera

    def _set_camera(self, camera: Camera) -> None:
        self._camera, self._own_camera, self._still = camera, True, None
        self.update()

    def _drop(self) -> None:
        self._camera = self._camera if self._own_camera else None
        self._still = None
        self.update()

    def wheelEvent(self, event: QWheelEvent) -> None:
        """The wheel zooms about the pointer."""
        self.zoom(1.18 ** (event.angleDelta().y() / 120.0), event.position())

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """A press may become a click on a fiber, or a drag of the picture."""
        self._pressed, self._dragged = event.position(), False

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Dragging moves the picture; else the fiber under the pointer is named."""
        if event.buttons() & Qt.MouseButton.LeftButton and self._pressed is not None:
            way = event.position() - self._pressed
            if self._dragged or way.manhattanLength() > 6:
                self._dragged, self._pressed = True, event.position()
                ratio = self.devicePixelRatioF()
                self._set_camera(self._seen().moved(way.x() * ratio, way.y() * ratio))
            return
        self._hover(self.fiber_at(event.position()))

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """A press and a release in one place are a click."""
        if self._pressed is not None and not self._dragged and event.button() == Qt.MouseButton.LeftButton:
            fiber = self.fiber_at(event.position())
            if fiber is not None:
                self.fiber_clicked.emit(fiber)
        self._pressed = None

    def leaveEvent(self, event) -> None:
        """Outside, no fiber is under the pointer."""
        self._hover(None)

    def _hover(self, fiber: int | None) -> None:
        if fiber != self._hovered:
            self._hovered = fiber
            self.fiber_hovered.emit(-1 if fiber is None else fiber)
            self.update()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Everything that the mouse does to the picture, by key."""
        view = next((each.name for each in VIEWS.values() if event.text().upper() == each.key), None)
        step = 40.0 * self._look().scale
        moves = {
            Qt.Key.Key_Left: (step, 0.0),
            Qt.Key.Key_Right: (-step, 0.0),
            Qt.Key.Key_Up: (0.0, step),
            Qt.Key.Key_Down: (0.0, -step),
        }
        if view is not None:
            self.set_view(view)
        elif event.key() in (Qt.Key.Key_Plus, Qt.Key.Key_Equal):
            self.zoom(1.25)
        elif event.key() == Qt.Key.Key_Minus:
            self.zoom(0.8)
        elif event.key() == Qt.Key.Key_0:
            self.show_all()
        elif event.key() in moves and self._own_camera:
            self._set_camera(self._seen().moved(*moves[event.key()]))
        else:
            super().keyPressEvent(event)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """A new size has the whole rig in it again."""
        self._row.setGeometry(0, 0, self.width(), self._row.sizeHint().height())
        self.show_all()
