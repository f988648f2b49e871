"""Names of fibers in the hang view: beside their ends where there is room, and of the one under the pointer always."""

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter

from composer.picture.hang.camera import Camera
from composer.picture.hang.paint import Room, band_names
from composer.picture.look import CENTRE, Look, colour, pen

Array = NDArray[np.float64]

NAMES_FROM_PX = 24.0
"""Pixels between neighbours, at scale 1, from which on fibers have their names beside them, as far as there is room."""

MOST_BESIDE = 64
"""Names that a name is kept from running into, the last ones written."""


def _end_names(painter: QPainter, room: Room, ends: Array, look: Look, taken: list[QRectF]) -> None:
    """A name below each end, left out where it would run into one that is there already."""
    bands = len(taken)
    for name, (x, y) in zip(room.names, ends.tolist(), strict=True):
        wide = look.width(name, 10.5)
        box = QRectF(x - wide / 2, y + look.px(5), wide + 2, look.px(14))
        if not any(box.intersects(other) for other in (*taken[:bands], *taken[bands:][-MOST_BESIDE:])):
            taken.append(box)
            look.write(painter, box, name, 10.5, look.theme.quiet_ink, CENTRE)


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
