"""Pens, letters and the hatch, at the scale of the picture at hand."""

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QBrush, QColor, QFont, QFontMetricsF, QPaintDevice, QPainter, QPen, QPixmap

from composer.picture.palette import DARK, Colour, Theme

FAMILIES = ["Noto Sans", "DejaVu Sans", "Segoe UI", "Helvetica Neue", "Arial", "Sans Serif"]

LEFT, CENTRE, RIGHT = Qt.AlignmentFlag.AlignLeft, Qt.AlignmentFlag.AlignHCenter, Qt.AlignmentFlag.AlignRight


def colour(of: Colour, alpha: int = 255) -> QColor:
    """A colour of the palette for Qt."""
    return QColor(*of, alpha)


def pen(of: Colour, width: float = 1.0, alpha: int = 255, dash: tuple[float, ...] = ()) -> QPen:
    """A pen of that colour and width in pixels."""
    made = QPen(colour(of, alpha), width)
    made.setCapStyle(Qt.PenCapStyle.FlatCap)
    if dash:
        made.setDashPattern(list(dash))
    return made


@contextmanager
def painting(on: QPaintDevice) -> Iterator[QPainter]:
    """A painter that ends whatever happens: Qt does not survive the end of what is still being painted on."""
    painter = QPainter(on)
    try:
        yield painter
    finally:
        painter.end()


@dataclass(frozen=True, slots=True)
class Look:
    """Sizes that grow with the picture, 1 at 1280 by 800, 3 on a 4K screen; and the colours that it is drawn in."""

    scale: float
    theme: Theme = DARK

    def px(self, size: float) -> int:
        """A size in pixels of the smallest picture, at this scale, whole and at least 1."""
        return max(1, round(size * self.scale))

    def font(self, size: float, bold: bool = False) -> QFont:
        """A plain face of that height."""
        font = QFont()
        font.setFamilies(FAMILIES)
        font.setStyleHint(QFont.StyleHint.SansSerif)
        font.setPixelSize(self.px(size))
        font.setBold(bold)
        return font

    def write(
        self,
        painter: QPainter,
        box: QRectF,
        text: str,
        size: float,
        of: Colour | None = None,
        align: Qt.AlignmentFlag = LEFT,
        bold: bool = False,
    ) -> float:
        """Write one line into a box, half way up, cut with an ellipsis where it is too long; returns its width."""
        font = self.font(size, bold)
        metrics = QFontMetricsF(font)
        shown = metrics.elidedText(text, Qt.TextElideMode.ElideRight, box.width())
        painter.setFont(font)
        painter.setPen(colour(of or self.theme.ink))
        painter.drawText(box, align | Qt.AlignmentFlag.AlignVCenter, shown)
        return metrics.horizontalAdvance(shown)

    def width(self, text: str, size: float, bold: bool = False) -> float:
        """How wide a text comes out."""
        return QFontMetricsF(self.font(size, bold)).horizontalAdvance(text)

    def hatch(self) -> QBrush:
        """Slanted strokes, light beside dark: seen over bright and dark threads, in any colours or none, the thread between."""
        size = self.px(8)
        tile = QPixmap(size, size)
        tile.fill(Qt.GlobalColor.transparent)
        painter = QPainter(tile)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        for of, shift in ((self.theme.hatch_dark, size / 4.0), (self.theme.hatch_light, 0.0)):
            painter.setPen(pen(of, size / 4.0, 255))
            for turn in (-1, 0, 1):
                begin = turn * size + shift
                painter.drawLine(QPointF(begin - size, 2.0 * size), QPointF(begin + 2.0 * size, -size))
        painter.end()
        return QBrush(tile)


def focus_frame(painter: QPainter, look: Look, width: float, height: float) -> None:
    """A frame just inside a widget of that size that the keys go to."""
    thick = look.px(2)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.setPen(pen(look.theme.chosen, thick))
    painter.drawRect(QRectF(thick / 2, thick / 2, width - thick, height - thick))
