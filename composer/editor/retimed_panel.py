"""What retiming would move, hit by hit, and the buttons that take it into the text."""

from collections.abc import Sequence

from PySide6.QtCore import Qt, Signal
from PySide6.QtWidgets import QHBoxLayout, QListWidgetItem, QPushButton, QVBoxLayout, QWidget

from composer.editor.messages import Hit, Retimed
from composer.editor.snags_panel import Wrapped


class RetimedPanel(QWidget):
    """The retiming beside the text as written.

    hit_chosen: a hit that was gone to; take_wanted: from and to, in s as written, of what is to be taken into the text
    """

    hit_chosen = Signal(object)
    take_wanted = Signal(float, float)

    def __init__(self) -> None:
        super().__init__()
        self._hits: tuple[Hit, ...] = ()
        self._passage: tuple[float, float] | None = None
        self.setAccessibleName("retiming")
        self._list = Wrapped("hits that retiming moves")
        self._list.currentRowChanged.connect(self._changed)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(2)
        column.addWidget(self._list, 1)
        row = QHBoxLayout()
        row.setContentsMargins(6, 2, 6, 4)
        self._one = self._button(row, "Take this hit into the text", self._take_one)
        self._some = self._button(row, "Take the passage", self._take_passage)
        self._all = self._button(row, "Take all of it", lambda: self.take_wanted.emit(0.0, float("inf")))
        row.addStretch(1)
        column.addLayout(row)
        self._enable()

    def _button(self, row: QHBoxLayout, word: str, does) -> QPushButton:
        button = QPushButton(word)
        button.setAccessibleName(word)
        button.clicked.connect(does)
        row.addWidget(button)
        return button

    @property
    def list(self) -> Wrapped:
        """The list itself."""
        return self._list

    @property
    def hits(self) -> tuple[Hit, ...]:
        """The hits listed."""
        return self._hits

    def show_retimed(self, retimed: Retimed, places: Sequence[str]) -> None:
        """List what moves; `places` are those of the hits as written."""
        self._hits = retimed.hits
        self._list.blockSignals(True)
        self._list.clear()
        for hit, place in zip(retimed.hits, places, strict=True):
            by = hit.now_s - hit.was_s
            way = "later" if by > 0 else "earlier"
            much = f"{abs(by) * 1000:.0f} ms" if abs(by) < 0.0995 else f"{abs(by):.2f} s"
            self._list.addItem(QListWidgetItem(f"{place}  {much} {way}: {hit.says}."))
        for says in [] if self._hits else retimed.says:
            item = QListWidgetItem(says)
            item.setFlags(Qt.ItemFlag.ItemIsEnabled)
            self._list.addItem(item)
        if self._hits and retimed.says:
            item = QListWidgetItem(retimed.says[0])
            item.setFlags(Qt.ItemFlag.ItemIsEnabled)
            self._list.insertItem(len(self._hits), item)
        self._list.setCurrentRow(-1)
        self._list.blockSignals(False)
        self._enable()

    def clear(self) -> None:
        """Nothing is known."""
        self._hits = ()
        self._list.clear()
        self._enable()

    def set_passage(self, passage: tuple[float, float] | None) -> None:
        """The passage that is looped, in s as written."""
        self._passage = passage
        self._enable()

    def _enable(self) -> None:
        self._one.setEnabled(0 <= self._list.currentRow() < len(self._hits))
        self._some.setEnabled(self._passage is not None and bool(self._hits))
        self._some.setToolTip(
            "" if self._passage else "loop a passage first: Ctrl + I and Ctrl + Shift + I say where it begins and ends"
        )
        self._all.setEnabled(bool(self._hits))

    def _changed(self, at: int) -> None:
        self._enable()
        if 0 <= at < len(self._hits):
            self.hit_chosen.emit(self._hits[at])

    def _take_one(self) -> None:
        hit = self._hits[self._list.currentRow()]
        self.take_wanted.emit(hit.was_s, hit.was_s)

    def _take_passage(self) -> None:
        if self._passage is not None:
            self.take_wanted.emit(*self._passage)
