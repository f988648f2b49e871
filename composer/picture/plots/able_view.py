"""What one fiber can do where it hangs, as a widget: for a page on a rig."""

from PySide6.QtCore import QRectF, QSize
from PySide6.QtGui import QPainter, QPaintEvent
from PySide6.QtWidgets import QWidget

from composer.limits.abilities import Abilities
from composer.picture.look import CENTRE, Look, colour
from composer.picture.palette import DARK, Theme
from composer.picture.plots import makes
from composer.rig.model import Rig


class AbleView(QWidget):
    """What one fiber can do where it hangs: stroke over pressure, filling and exhausting, and its fastest rates over strain."""

    def __init__(self, parent: QWidget | None = None, theme: Theme = DARK):
        super().__init__(parent)
        self._theme = theme
        self._row: makes.Row | None = None
        self.setMinimumSize(420, 150)
        self.setAccessibleName("stroke over pressure and fastest rates over strain")

    def show_fiber(self, rig: Rig, abilities: Abilities, fiber: int) -> None:
        """Draw what a fiber of a rig can do."""
        self._row = makes.row_of(rig, abilities, int(abilities.which[fiber]))
        able = self._row.able
        self.setAccessibleDescription(
            f"{rig.fibers[fiber].name}: stroke {100.0 * able.stroke:.1f} %, fastest"
            f" {able.fill.max():.2f} 1/s filling and {able.exhaust.max():.2f} 1/s exhausting"
        )
        self.update()

    def set_theme(self, theme: Theme) -> None:
        """Draw in these colours."""
        self._theme = theme
        self.update()

    def sizeHint(self) -> QSize:
        """The size that it likes."""
        return QSize(900, 260)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw the two plots and what the make is."""
        ratio = self.devicePixelRatioF()
        width, height = self.width() * ratio, self.height() * ratio
        look = Look(max(1.0, min(width / 900.0, height / 260.0)), self._theme)
        painter = QPainter(self)
        painter.scale(1.0 / ratio, 1.0 / ratio)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.fillRect(QRectF(0, 0, width, height), colour(self._theme.ground))
        if self._row is None:
            look.write(painter, QRectF(0, 0, width, height), "no fiber is chosen", 13, self._theme.quiet_ink, CENTRE)
        else:
            look.write(painter, QRectF(look.px(8), 0, width - look.px(16), look.px(20)), self._row.title, 12.5, bold=True)
            makes.paint_able(
                painter, look, QRectF(look.px(4), look.px(24), width - look.px(8), height - look.px(26)), self._row.able
            )
        painter.end()
