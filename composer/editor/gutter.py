"""The strip of line numbers beside the text."""

from typing import TYPE_CHECKING

from PySide6.QtCore import QRect, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QPainter, QPaintEvent
from PySide6.QtWidgets import QWidget

if TYPE_CHECKING:
    from composer.editor.pane import TextPane


class Gutter(QWidget):
    """Numbers of the lines in view; one that is wrong has a mark beside it, one that is lit a bar, the caret's is bright."""

    def __init__(self, pane: "TextPane"):
        super().__init__(pane)
        self._pane = pane
        self.setAccessibleName("line numbers")

    def needs(self) -> int:
        """Pixels that the numbers need."""
        metrics = self._pane.fontMetrics()
        return metrics.horizontalAdvance("9" * max(3, len(str(self._pane.blockCount())))) + 2 * metrics.horizontalAdvance("9")

    def sizeHint(self) -> QSize:
        """As wide as the largest number."""
        return QSize(self.needs(), 0)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw them."""
        painter = QPainter(self)
        self._paint(painter, self.width(), event.rect())
        painter.end()

    def _paint(self, painter: QPainter, width: int, box: QRect) -> None:
        pane, looks = self._pane, self._pane.looks
        theme = looks.theme
        painter.fillRect(box, QColor(*theme.panel))
        painter.setFont(pane.font())
        step = pane.fontMetrics().horizontalAdvance("9")
        here = pane.textCursor().blockNumber()
        block = pane.firstVisibleBlock()
        top = pane.blockBoundingGeometry(block).translated(pane.contentOffset()).top()
        while block.isValid() and top <= box.bottom():
            height = pane.blockBoundingRect(block).height()
            number = block.blockNumber()
            if number + 1 in looks.lit:
                painter.fillRect(QRectF(0, top, 3, height), QColor(*theme.chosen))
            wrong = number + 1 in looks.marks
            painter.setPen(QColor(*(theme.fault if wrong else theme.ink if number == here else theme.quiet_ink)))
            line = QRectF(0, top, width - step, height)
            painter.drawText(line, Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter, str(number + 1))
            if wrong:
                painter.drawText(QRectF(4, top, step * 2, height), Qt.AlignmentFlag.AlignVCenter, "\u25b2")
            top += height
            block = block.next()
