"""The lanes below the cloth, on its time axis, and the axis of seconds under them."""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QPainter, QPolygonF

from composer.picture.axes import second_ticks, value_ticks
from composer.picture.look import CENTRE, LEFT, RIGHT, Look, colour, pen
from composer.picture.scene import Lane, Scene

Array = NDArray[np.float64]


def paint(painter: QPainter, look: Look, scene: Scene, left: float, top: float, width: float, height: float) -> None:
    """Draw all lanes of a scene, one under the other, and the axis of seconds under the last."""
    gap = look.px(7)
    each = height / max(1, len(scene.lanes)) - gap
    ticks = second_ticks(scene.from_s, scene.to_s, width, look.px(64))
    foot = top
    for number, lane in enumerate(scene.lanes):
        box = QRectF(left, top + gap + number * (each + gap), width, each)
        painter.fillRect(box, colour(look.theme.panel))
        for tick in ticks:
            x = round(left + (tick.at - scene.from_s) / (scene.to_s - scene.from_s) * width) + 0.5
            painter.setPen(pen(look.theme.faint_line))
            painter.drawLine(QPointF(x, box.top()), QPointF(x, box.bottom()))
        _lane(painter, look, lane, box, scene)
        foot = box.bottom()
    look.write(
        painter,
        QRectF(look.px(16), foot + look.px(3), left - look.px(50), look.px(18)),
        "time",
        12,
        look.theme.quiet_ink,
        RIGHT,
    )
    for tick in ticks:
        x = left + (tick.at - scene.from_s) / (scene.to_s - scene.from_s) * width
        painter.setPen(pen(look.theme.quiet_ink))
        painter.drawLine(QPointF(x, foot), QPointF(x, foot + look.px(4)))
        box = QRectF(x - look.px(40), foot + look.px(3), look.px(80), look.px(18))
        look.write(painter, box, tick.label, 11.5, look.theme.quiet_ink, CENTRE)


def _lane(painter: QPainter, look: Look, lane: Lane, box: QRectF, scene: Scene) -> None:
    inset = look.px(4)
    low, high = lane.low, max(lane.high, lane.low + 1e-9)

    def y_of(value: float) -> float:
        return box.bottom() - inset - (value - low) / (high - low) * (box.height() - 2 * inset)

    _scale(painter, look, lane, box, y_of)
    if lane.supply:
        _short(painter, look, box, scene)
    if lane.limit is not None and low <= lane.limit <= high:
        y = y_of(lane.limit)
        painter.setPen(pen(look.theme.limit, max(1.0, 1.2 * look.scale), 255, (5.0, 3.0)))
        painter.drawLine(QPointF(box.left(), y), QPointF(box.right(), y))
        wide = look.width(lane.limit_word, 10.5)
        above = y - look.px(14) > box.top()
        word = QRectF(box.right() - wide - look.px(6), y - look.px(14) if above else y + look.px(1), wide + 2, look.px(13))
        look.write(painter, word, lane.limit_word, 10.5, look.theme.limit, LEFT)
    painter.setPen(pen(getattr(look.theme, lane.colour), max(1.4, 1.5 * look.scale)))
    columns = np.flatnonzero(np.isfinite(lane.values))
    for run in np.split(columns, np.flatnonzero(np.diff(columns) > 1) + 1):
        if len(run):
            x = box.left() + (run + 0.5) * box.width() / len(lane.values)
            y = box.bottom() - inset - (np.clip(lane.values[run], low, high) - low) / (high - low) * (box.height() - 2 * inset)
            kept = bends(y)
            painter.drawPolyline(QPolygonF([QPointF(a, b) for a, b in zip(x[kept].tolist(), y[kept].tolist(), strict=True)]))


def bends(y: Array) -> Array:
    """The indices of points, equally far apart, at which a line through them bends by as much as can be seen, and both ends."""
    if len(y) < 3:
        return np.arange(len(y))
    kept = np.abs(y[2:] - 2 * y[1:-1] + y[:-2]) > 0.02
    return np.concatenate([[0], np.flatnonzero(kept) + 1, [len(y) - 1]])


def _short(painter: QPainter, look: Look, box: QRectF, scene: Scene) -> None:
    """Snags of the air: a hatch along the foot of the lane, which leaves the curve to be read."""
    for snag in scene.snags:
        if snag.fiber is None:
            begin, end = (
                box.left() + (at - scene.from_s) / (scene.to_s - scene.from_s) * box.width() for at in (snag.from_s, snag.to_s)
            )
            high = look.px(8)
            shown = QRectF(begin, box.bottom() - high, max(end - begin, look.px(5)), high).intersected(box)
            painter.fillRect(shown, look.hatch())


def _scale(painter: QPainter, look: Look, lane: Lane, box: QRectF, y_of: Callable[[float], float]) -> None:
    """The lane's name, and round values at its left."""
    line = look.px(13)
    values = value_ticks(lane.low, lane.high, max(3, int(box.height() / (1.4 * line))))
    wide = max((look.width(f"{value:g}", 10) for value in values), default=0.0)
    for value in values:
        y = y_of(value)
        painter.setPen(pen(look.theme.line))
        painter.drawLine(QPointF(box.left(), round(y) + 0.5), QPointF(box.right(), round(y) + 0.5))
        place = min(max(y - line / 2, box.top() - 1), box.bottom() - line + 1)
        label = QRectF(box.left() - wide - look.px(8), place, wide + 2, line)
        look.write(painter, label, f"{value:g}", 10, look.theme.quiet_ink, RIGHT)
    room = box.left() - wide - look.px(24)
    middle = box.center().y()
    look.write(painter, QRectF(look.px(10), middle - line, room, line), lane.name, 11.5, look.theme.ink, LEFT, bold=True)
    look.write(painter, QRectF(look.px(10), middle, room, line), lane.unit, 10.5, look.theme.quiet_ink, LEFT)
