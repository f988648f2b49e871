"""The list of what may stand at the caret, below it; the keys stay with the text."""

from collections.abc import Sequence
from typing import TYPE_CHECKING

from PySide6.QtCore import QEvent, QObject, QPoint, Qt, Signal
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import QAbstractItemView, QListWidget, QListWidgetItem

from composer.editor.pane import TextPane

if TYPE_CHECKING:
    from composer.edits.completion import Offer

MOST_ROWS = 10


class Offers(QListWidget):
    """Offers for the word at the caret. Up and Down choose, Return or Tab takes, Escape leaves."""

    taken = Signal(object)

    def __init__(self, pane: TextPane):
        super().__init__(pane)
        self._pane = pane
        self._offers: tuple[Offer, ...] = ()
        self._chosen = True
        self.setObjectName("offers")
        self.setAccessibleName("what may stand here")
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
        self.setUniformItemSizes(True)
        self.itemClicked.connect(lambda _: self.take())
        self.hide()
        pane.installEventFilter(self)

    def offer(self, offers: "Sequence[Offer]", asked_for: bool = True) -> None:
        """Show offers for the place of the caret; none hides the list.

        asked_for: Return takes the first at once; where they came by themselves it does so only once one was chosen.
        """
        self._offers = tuple(offers)
        self._chosen = asked_for
        self.clear()
        if not offers:
            self.hide()
            return
        widest = max(len(one.text) for one in offers)
        for one in offers:
            says = f"{one.text:<{widest}}   {one.says}" if one.says else one.text
            item = QListWidgetItem(says)
            item.setData(Qt.ItemDataRole.AccessibleTextRole, f"{one.text}, {one.says}")
            self.addItem(item)
        self.setCurrentRow(0)
        self._place()
        self.show()
        self.raise_()

    def _place(self) -> None:
        metrics = self.fontMetrics()
        row = max(self.sizeHintForRow(0), metrics.height())
        rows = min(self.count(), MOST_ROWS)
        viewport = self._pane.viewport()
        widest = max(metrics.horizontalAdvance(self.item(at).text()) for at in range(min(self.count(), 60)))
        wide = min(widest + 40, viewport.width() - 8)
        high = rows * row + 2 * self.frameWidth() + 2
        caret = self._pane.cursorRect()
        at = viewport.mapTo(self._pane, QPoint(caret.left(), caret.bottom() + 2))
        if at.y() + high > self._pane.height():
            at.setY(max(0, viewport.mapTo(self._pane, caret.topLeft()).y() - high - 2))
        at.setX(max(0, min(at.x(), self._pane.width() - wide - 4)))
        self.setGeometry(at.x(), at.y(), wide, high)

    def take(self) -> None:
        """Take the chosen one."""
        row = self.currentRow()
        self.hide()
        if 0 <= row < len(self._offers):
            self.taken.emit(self._offers[row])

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """While the list is there, some keys are for it."""
        if not self.isVisible():
            return False
        if event.type() == QEvent.Type.FocusOut:
            self.hide()
            return False
        if event.type() != QEvent.Type.KeyPress or not isinstance(event, QKeyEvent):
            return False
        key = event.key()
        if event.modifiers() & ~Qt.KeyboardModifier.KeypadModifier:
            return False
        step = {Qt.Key.Key_Up: -1, Qt.Key.Key_Down: 1, Qt.Key.Key_PageUp: -MOST_ROWS, Qt.Key.Key_PageDown: MOST_ROWS}.get(key)
        if step is not None:
            self.setCurrentRow(max(0, min(self.currentRow() + step, self.count() - 1)))
            self._chosen = True
        elif key == Qt.Key.Key_Tab or (key in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and self._chosen):
            self.take()
        elif key == Qt.Key.Key_Escape:
            self.hide()
        else:
            if key in (Qt.Key.Key_Return, Qt.Key.Key_Enter, Qt.Key.Key_Left, Qt.Key.Key_Right, Qt.Key.Key_Home, Qt.Key.Key_End):
                self.hide()
            return False
        return True
