"""A fit over its data: strain over pressure, strain over time, and what is left between them."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QPolygonF

from composer.fit.fitted import Fitted
from composer.picture import palette
from composer.picture.axes import second_ticks, value_ticks
from composer.picture.look import CENTRE, RIGHT, Look, colour, pen
from composer.picture.palette import Colour

Array = NDArray[np.float64]

WIDTH, HEIGHT = 1800, 1120
MEASURED: Colour = palette.SUPPLY
MODELLED: Colour = palette.DUTY
LEFT_OVER: Colour = palette.MISS

LOOK = Look(1.4)


@dataclass(frozen=True, slots=True)
class Frame:
    """A plot's box in pixels and what its edges mean."""

    box: QRectF
    x: tuple[float, float]
    y: tuple[float, float]

    def points(self, x: Array, y: Array) -> QPolygonF:
        """Values (N,) as points in pixels."""
        across = self.box.left() + (x - self.x[0]) / (self.x[1] - self.x[0]) * self.box.width()
        up = self.box.bottom() - (y - self.y[0]) / (self.y[1] - self.y[0]) * self.box.height()
        return QPolygonF([QPointF(a, b) for a, b in zip(across.tolist(), up.tolist(), strict=True)])


def paint(painter: QPainter, fitted: Fitted, title: str) -> None:
    """Draw the fit into WIDTH by HEIGHT pixels; `title` names the bench."""
    px = LOOK.px
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    painter.fillRect(QRectF(0, 0, WIDTH, HEIGHT), colour(palette.GROUND))
    head = QRectF(px(24), px(12), WIDTH - px(48), px(34))
    wide = LOOK.write(painter, head, f"{fitted.name}: {fitted.kind} fiber fitted to {title}", 19, bold=True)
    head.setLeft(head.left() + wide + px(24))
    LOOK.write(painter, head, f"{fitted.rows} rows, noise left {fitted.noise:.2g} of strain", 13, palette.QUIET_INK)
    _legend(painter, QRectF(px(24), px(46), WIDTH - px(48), px(22)))
    pressure = fitted.pressure / 1e3
    strain = _range(np.concatenate([fitted.measured, fitted.strain]))
    top, bottom = px(104), HEIGHT - px(56)
    loop = Frame(QRectF(px(70), top, px(470), bottom - top), _range(pressure), strain)
    _axes(painter, loop, "strain over pressure (kPa)", False)
    _dots(painter, loop, pressure, fitted.measured)
    _line(painter, loop, pressure, fitted.strain)
    left = loop.box.right() + px(70)
    cut = top + (bottom - top) * 0.62
    span = (float(fitted.time[0]), float(fitted.time[-1]))
    run = Frame(QRectF(left, top, WIDTH - left - px(28), cut - top), span, strain)
    _axes(painter, run, "strain over time", True)
    _dots(painter, run, fitted.time, fitted.measured)
    _line(painter, run, fitted.time, fitted.strain)
    apart = fitted.measured - fitted.strain
    most = max(float(np.quantile(np.abs(apart), 0.995)) * 1.3, 1e-6)
    low = cut + px(70)
    rest = Frame(QRectF(left, low, run.box.width(), bottom - low), span, (-most, most))
    _axes(painter, rest, "measured less fitted", True)
    _dots(painter, rest, fitted.time, np.clip(apart, -most, most), LEFT_OVER)


def _range(values: Array) -> tuple[float, float]:
    """From the least to the greatest, with a little room."""
    low, high = float(values.min()), float(values.max())
    room = 0.04 * max(high - low, 1e-9)
    return low - room, high + room


def _legend(painter: QPainter, box: QRectF) -> None:
    x = box.left()
    for word, of, dot in (("measured", MEASURED, True), ("fitted", MODELLED, False)):
        middle = box.center().y()
        if dot:
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(colour(of))
            for step in range(4):
                painter.drawEllipse(QPointF(x + LOOK.px(4 + 7 * step), middle), LOOK.px(2), LOOK.px(2))
        else:
            painter.setPen(pen(of, 2.0 * LOOK.scale))
            painter.drawLine(QPointF(x, middle), QPointF(x + LOOK.px(28), middle))
        words = QRectF(x + LOOK.px(36), box.top(), LOOK.px(160), box.height())
        x = words.left() + LOOK.write(painter, words, word, 12.5) + LOOK.px(26)


def _axes(painter: QPainter, frame: Frame, title: str, seconds: bool) -> None:
    """Ground, rules, labels and title of a plot."""
    box, px = frame.box, LOOK.px
    painter.fillRect(box, colour(palette.PANEL))
    LOOK.write(painter, QRectF(box.left(), box.top() - px(26), box.width(), px(22)), title, 13)
    if seconds:
        across = [(tick.at, tick.label) for tick in second_ticks(*frame.x, box.width(), px(64))]
    else:
        across = [(float(at), f"{at:g}") for at in value_ticks(*frame.x, 8)]
    up = value_ticks(*frame.y, max(3, int(box.height() / px(34))))
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
    for at, label in across:
        x = frame.points(np.array([at]), np.array([frame.y[0]])).first().x()
        painter.setPen(pen(palette.FAINT_LINE))
        painter.drawLine(QPointF(x, box.top()), QPointF(x, box.bottom()))
        word = QRectF(x - px(40), box.bottom() + px(4), px(80), px(20))
        LOOK.write(painter, word, label, 11.5, palette.QUIET_INK, CENTRE)
    for at in up:
        y = frame.points(np.array([frame.x[0]]), np.array([at])).first().y()
        painter.setPen(pen(palette.LINE if abs(at) < 1e-12 else palette.FAINT_LINE))
        painter.drawLine(QPointF(box.left(), y), QPointF(box.right(), y))
        word = QRectF(box.left() - px(66), y - px(10), px(60), px(20))
        LOOK.write(painter, word, f"{at:.6g}", 11.5, palette.QUIET_INK, RIGHT)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)


def _dots(painter: QPainter, frame: Frame, x: Array, y: Array, of: Colour = MEASURED) -> None:
    painter.save()
    painter.setClipRect(frame.box)
    # Many dots side by side make a band; half see-through, they show where most of them lie.
    dots = pen(of, 3.2 * LOOK.scale if len(x) < 400 else 2.6 * LOOK.scale, 255 if len(x) < 400 else 150)
    dots.setCapStyle(Qt.PenCapStyle.RoundCap)
    painter.setPen(dots)
    painter.drawPoints(frame.points(x, y))
    painter.restore()


def _line(painter: QPainter, frame: Frame, x: Array, y: Array) -> None:
    painter.save()
    painter.setClipRect(frame.box)
    painter.setPen(pen(MODELLED, 1.1 * LOOK.scale))
    painter.drawPolyline(frame.points(x, y))
    painter.restore()
