"""The line at the window's foot: what is being done, where the caret is, what is wrong, whether all is saved, the grid."""

from fractions import Fraction

from PySide6.QtCore import QEvent, QSize, Qt, Signal
from PySide6.QtGui import QPainter, QPaintEvent
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QLabel, QSizePolicy, QWidget

from composer.edits.grids import GRIDS

SAY_MS = 8000


def grid_in_words(grid: Fraction) -> str:
    """A grid of counts as a person says it."""
    return "whole counts" if grid == 1 else f"{grid} count"


class Elided(QLabel):
    """A line of words that takes what room there is and asks for none: the end of what does not fit is left out, and told
    under the pointer."""

    def __init__(self) -> None:
        super().__init__()
        self.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Preferred)

    @property
    def fits(self) -> bool:
        """Whether all of it is seen."""
        return self.fontMetrics().horizontalAdvance(self.text()) <= self.contentsRect().width()

    def minimumSizeHint(self) -> QSize:
        """None across."""
        return QSize(0, super().minimumSizeHint().height())

    def paintEvent(self, event: QPaintEvent) -> None:
        """As much as there is room for."""
        box = self.contentsRect()
        words = self.fontMetrics().elidedText(self.text(), Qt.TextElideMode.ElideRight, box.width())
        QPainter(self).drawText(box, Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter, words)

    def event(self, event: QEvent) -> bool:
        """The whole of it under the pointer, where it does not fit."""
        if event.type() == QEvent.Type.ToolTip:
            self.setToolTip("" if self.fits else self.text())
        return super().event(event)


class Foot(QWidget):
    """Words at the foot of the window. grid_chosen: another grid for what is dragged."""

    grid_chosen = Signal(object)

    def __init__(self) -> None:
        super().__init__()
        self.setAccessibleName("state of the score")
        row = QHBoxLayout(self)
        row.setContentsMargins(8, 1, 8, 1)
        row.setSpacing(18)
        self._labels: dict[str, QLabel] = {}
        for name, stretch in (("word", 1), ("snags", 0), ("place", 0), ("saved", 0)):
            label = Elided() if name == "word" else QLabel()
            label.setAccessibleName(name)
            self._labels[name] = label
            row.addWidget(label, stretch)
        self._grids = QComboBox()
        self._grids.setAccessibleName("grid that drags snap to, in counts")
        self._grids.setToolTip("what is dragged snaps to these counts; with Alt it does not")
        for grid in GRIDS:
            self._grids.addItem(f"grid: {grid_in_words(grid)}", grid)
        self._grids.setCurrentIndex(GRIDS.index(Fraction(1, 4)))
        self._grids.currentIndexChanged.connect(lambda at: self.grid_chosen.emit(GRIDS[at]))
        row.addWidget(self._grids)

    def say(self, name: str, text: str) -> None:
        """Say something in one of the places: word, snags, place, saved."""
        label = self._labels[name]
        if label.text() != text:
            label.setText(text)
            label.setAccessibleDescription(text)

    def said(self, name: str) -> str:
        """What is said there."""
        return self._labels[name].text()

    def step_grid(self, way: int) -> None:
        """A finer grid (1), a coarser one (-1)."""
        self._grids.setCurrentIndex(max(0, min(self._grids.currentIndex() + way, self._grids.count() - 1)))
