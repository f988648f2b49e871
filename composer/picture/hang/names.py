"""Names of fibers in the hang view: beside their ends where there is room, and of the one under the pointer always."""

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QStaticText, QTransform

from composer.picture.hang.camera import Camera
from composer.picture.hang.paint import Room, band_names
from composer.picture.look import CENTRE, Look, colour, pen

Array = NDArray[np.float64]
Box = tuple[float, float, float, float]

NAMES_FROM_PX = 24.0
"""Pixels between neighbours, at scale 1, from which on fibers have their names beside them, as far as there is room."""

SIZE = 10.5
"""Of their letters, at scale 1."""


class Taken:
    """Boxes on a picture, found again by the cells of a grid that they lie in."""

    def __init__(self, wide: float, high: float):
        self._wide, self._high = wide, high
        self._cells: dict[tuple[int, int], list[Box]] = {}

    def _of(self, box: Box) -> list[tuple[int, int]]:
        left, top, right, bottom = box
        columns = range(int(left // self._wide), int(right // self._wide) + 1)
        rows = range(int(top // self._high), int(bottom // self._high) + 1)
        return [(column, row) for column in columns for row in rows]

    def takes(self, box: Box, anyway: bool = False) -> bool:
        """Whether there is room for a box, left, top, right and bottom, which then has it; `anyway`: it has it all the same."""
        left, top, right, bottom = box
        cells = self._of(box)
        if not anyway:
            for cell in cells:
                for one in self._cells.get(cell, ()):
                    if left < one[2] and one[0] < right and top < one[3] and one[1] < bottom:
                        return False
        for cell in cells:
            self._cells.setdefault(cell, []).append(box)
        return True


@lru_cache(maxsize=8192)
def _text(name: str, look: Look) -> QStaticText:
    """A name, laid out once."""
    text = QStaticText(name)
    text.setTextFormat(Qt.TextFormat.PlainText)
    text.setPerformanceHint(QStaticText.PerformanceHint.AggressiveCaching)
    text.prepare(QTransform(), look.font(SIZE))
    return text


def _end_names(painter: QPainter, room: Room, ends: Array, look: Look, bands: list[QRectF]) -> None:
    """A name below each end, left out where it would run into one that is there already."""
    high, down = look.px(14), look.px(5)
    taken = Taken(look.px(48), high)
    for box in bands:
        taken.takes((box.left(), box.top(), box.right(), box.bottom()), anyway=True)
    painter.setFont(look.font(SIZE))
    painter.setPen(colour(look.theme.quiet_ink))
    for name, (x, y) in zip(room.names, ends.tolist(), strict=True):
        text = _text(name, look)
        size = text.size()
        wide = size.width()
        left, top = x - wide / 2, y + down
        if taken.takes((left, top, left + wide + 2, top + high)):
            painter.drawStaticText(QPointF(left, top + (high - size.height()) / 2), text)


def paint_names(
    painter: QPainter, room: Room, camera: Camera, lines: Array, look: Look, hovered: int | None, width: int
) -> None:
    """Names beside the ends of fibers where they lie far enough apart, and that of the fiber under the pointer always."""
    if not len(room.names):
        return
    ends = lines[room.hanging.first[1:] - 1]
    gaps = np.hypot(*np.diff(ends, axis=0).T) if len(ends) > 1 else np.array([np.inf])
    if np.median(gaps) >= NAMES_FROM_PX * look.scale:
        _end_names(painter, room, ends, look, [box for _, box in band_names(room, camera, look, width)])
    if hovered is not None and hovered < len(room.names):
        x, y = ends[hovered]
        name = room.names[hovered]
        wide = look.width(name, 13, bold=True) + look.px(14)
        box = QRectF(min(max(x + look.px(10), 2.0), width - wide - 2.0), y - look.px(11), wide, look.px(22))
        painter.setPen(pen(look.theme.line, 1.0))
        painter.setBrush(colour(look.theme.panel))
        painter.drawRoundedRect(box, look.px(4), look.px(4))
        look.write(painter, box, name, 13, look.theme.ink, CENTRE, bold=True)
