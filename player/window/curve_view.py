"""What a control's way becomes: its curve between low and high, drawn."""

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QPaintEvent, QPolygonF
from PySide6.QtWidgets import QWidget

from composer.picture.chrome import scale_of
from composer.picture.look import LEFT, RIGHT, Look, colour, painting, pen
from composer.picture.palette import DARK, Theme
from player.inputs.model import Stroke

POINTS = 49


class CurveView(QWidget):
    """Draws a stroke bind: the control to the right, the stroke wanted upwards, both from 0 to all of it."""

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self._theme: Theme = DARK
        self._stroke: Stroke | None = None
        self.setMinimumHeight(90)
        self.setAccessibleName("curve and range of the bind")

    def set_theme(self, theme: Theme) -> None:
        """Draw in these colours."""
        self._theme = theme
        self.update()

    def show_stroke(self, stroke: Stroke | None) -> None:
        """Another bind; None for one that moves no fibers."""
        self._stroke = stroke
        self.setAccessibleDescription(
            "" if stroke is None else f"{stroke.curve}, from {100 * stroke.low:g} to {100 * stroke.high:g} % of the stroke"
        )
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        """The frame, the band between low and high, the curve."""
        theme, stroke = self._theme, self._stroke
        look = Look(scale_of(self.window().width(), self.window().height()), theme)
        with painting(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            painter.fillRect(self.rect(), colour(theme.panel))
            if stroke is None:
                return
            pad = look.px(20)
            box = QRectF(look.px(58), look.px(10), self.width() - look.px(58) - pad, self.height() - look.px(10) - pad)

            def at(x: float, y: float) -> QPointF:
                return QPointF(box.left() + x * box.width(), box.bottom() - y * box.height())

            low, high = sorted((stroke.low, stroke.high))
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(colour(theme.able))
            painter.drawRect(QRectF(at(0.0, high), at(1.0, low)))
            painter.setPen(pen(theme.edge, max(1.0, look.scale)))
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawRect(box)
            painter.setPen(pen(theme.retimed, max(2.0, 2.5 * look.scale)))
            points = [at(n / (POINTS - 1), stroke.stroke(n / (POINTS - 1))) for n in range(POINTS)]
            painter.drawPolyline(QPolygonF(points))
            for share in {stroke.low, stroke.high}:
                y = at(0.0, share).y()
                words = QRectF(0, y - look.px(9), look.px(52), look.px(18))
                look.write(painter, words, f"{100 * share:.0f} %", 13, theme.ink, RIGHT)
            foot = QRectF(box.left(), box.bottom() + look.px(2), box.width(), look.px(17))
            look.write(painter, foot, "control down", 12, theme.quiet_ink, LEFT)
            look.write(painter, foot, "up", 12, theme.quiet_ink, RIGHT)
