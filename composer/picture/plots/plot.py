"""A plain plot: two axes with round ticks, curves named where they run; for makes, and for fits to bench data."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QPainter, QPolygonF

from composer.picture.axes import value_ticks
from composer.picture.look import CENTRE, LEFT, RIGHT, Look, colour, pen
from composer.picture.palette import Colour

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Curve:
    """A line through `x`, `y` (N,); `dashed` where it is held or taken over; arrowheads stand at its points `arrows`."""

    x: Array
    y: Array
    of: Colour
    name: str = ""
    dashed: bool = False
    arrows: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class Axis:
    """From `low` to `high`, what it measures with its unit in `title`."""

    low: float
    high: float
    title: str


def paint(
    painter: QPainter, look: Look, box: QRectF, x: Axis, y: Axis, curves: Sequence[Curve], right: Axis | None = None
) -> None:
    """Draw a plot into a box, the names of its curves above it on the right; `right` is a second scale for y."""
    inner = box.adjusted(look.px(52), look.px(22), -look.px(52 if right else 12), -look.px(36))
    painter.fillRect(inner, colour(look.theme.panel))
    _scales(painter, look, inner, x, y, right)
    painter.save()
    painter.setClipRect(inner.adjusted(-look.px(2), -look.px(2), look.px(2), look.px(2)))
    for curve in curves:
        _curve(painter, look, inner, x, y, curve)
    painter.restore()
    # Names go to the right of y's title, above the plot, where no curve runs.
    at = inner.right()
    for curve in reversed([one for one in curves if one.name]):
        wide = look.width(curve.name, 12)
        look.write(painter, QRectF(at - wide - 2, box.top(), wide + 4, look.px(20)), curve.name, 12, curve.of)
        stroke = at - wide - look.px(8)
        painter.setPen(pen(curve.of, look.px(2), dash=(3.0, 2.0) if curve.dashed else ()))
        painter.drawLine(QPointF(stroke - look.px(18), box.top() + look.px(10)), QPointF(stroke, box.top() + look.px(10)))
        at = stroke - look.px(34)


def _scales(painter: QPainter, look: Look, inner: QRectF, x: Axis, y: Axis, right: Axis | None) -> None:
    for value in value_ticks(x.low, x.high, max(2, int(inner.width() / look.px(60)))):
        at = inner.left() + (value - x.low) / (x.high - x.low) * inner.width()
        painter.setPen(pen(look.theme.faint_line, 1.0))
        painter.drawLine(QPointF(at, inner.top()), QPointF(at, inner.bottom()))
        box = QRectF(at - look.px(40), inner.bottom() + look.px(3), look.px(80), look.px(14))
        look.write(painter, box, f"{value:g}", 11, look.theme.quiet_ink, CENTRE)
    most = max(2, int(inner.height() / look.px(28)))
    for axis, side in ((y, LEFT), (right, RIGHT)):
        if axis is None:
            continue
        for value in value_ticks(axis.low, axis.high, most):
            at = inner.bottom() - (value - axis.low) / (axis.high - axis.low) * inner.height()
            if side is LEFT:
                painter.setPen(pen(look.theme.faint_line, 1.0))
                painter.drawLine(QPointF(inner.left(), at), QPointF(inner.right(), at))
                box = QRectF(inner.left() - look.px(50), at - look.px(7), look.px(45), look.px(14))
                look.write(painter, box, f"{value:g}", 11, look.theme.quiet_ink, RIGHT)
            else:
                painter.setPen(pen(look.theme.quiet_ink, 1.0))
                painter.drawLine(QPointF(inner.right(), at), QPointF(inner.right() + look.px(4), at))
                box = QRectF(inner.right() + look.px(7), at - look.px(7), look.px(45), look.px(14))
                look.write(painter, box, f"{value:g}", 11, look.theme.quiet_ink, LEFT)
    top = inner.top() - look.px(22)
    look.write(painter, QRectF(inner.left() - look.px(46), top, inner.width() / 2, look.px(20)), y.title, 12, look.theme.ink)
    if right is not None:
        look.write(painter, QRectF(inner.right() + look.px(7), top, look.px(45), look.px(20)), right.title, 12, look.theme.ink)
    look.write(
        painter,
        QRectF(inner.left(), inner.bottom() + look.px(17), inner.width(), look.px(16)),
        x.title,
        12,
        look.theme.ink,
        CENTRE,
    )


def _curve(painter: QPainter, look: Look, inner: QRectF, x: Axis, y: Axis, curve: Curve) -> None:
    at_x = inner.left() + (curve.x - x.low) / (x.high - x.low) * inner.width()
    at_y = inner.bottom() - (curve.y - y.low) / (y.high - y.low) * inner.height()
    painter.setPen(pen(curve.of, look.px(2), dash=(3.0, 2.0) if curve.dashed else ()))
    painter.drawPolyline(QPolygonF([QPointF(a, b) for a, b in zip(at_x, at_y, strict=True)]))
    gone = np.concatenate([[0.0], np.cumsum(np.hypot(np.diff(at_x), np.diff(at_y)))])
    for point in curve.arrows:
        # The way is taken over a few pixels, as curves have far more points than that.
        tip, before = np.array([at_x[point], at_y[point]]), gone[point] - look.px(4)
        way = tip - np.array([np.interp(before, gone, at_x), np.interp(before, gone, at_y)])
        size = float(np.hypot(*way))
        if size > 0.0:
            _arrow(painter, look, tip, way / size, curve.of)


def _arrow(painter: QPainter, look: Look, tip: Array, way: Array, of: Colour) -> None:
    across = np.array([-way[1], way[0]]) * look.px(5)
    foot = tip - way * look.px(11)
    painter.setBrush(colour(of))
    painter.setPen(pen(of, 1.0))
    painter.drawPolygon(QPolygonF([QPointF(*tip), QPointF(*(foot + across)), QPointF(*(foot - across))]))
    painter.setBrush(colour(of, 0))
