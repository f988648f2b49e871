"""The list of this user's runs: attach to one, or begin what was asked for."""

from collections.abc import Sequence

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QDialog, QHBoxLayout, QLabel, QListWidget, QPushButton, QVBoxLayout

from composer.picture.palette import DARK
from player.window.chrome import sheet_of
from player.window.ways import RunRow


class Choosing(QDialog):
    """Which run. `chosen`: its name, "" for a new one; None where the list was closed. Nothing is attached to meanwhile."""

    def __init__(self, runs: Sequence[RunRow], begins: str = ""):
        super().__init__()
        self.chosen: str | None = None
        self.setWindowTitle("rehearse - which run?")
        self.setStyleSheet(sheet_of(DARK, 1.0))
        self._names = [row.name for row in runs] + ([""] if begins else [])
        says = QLabel("Runs of yours are on. Attach to one" + (", or begin another:" if begins else ":"))
        says.setAccessibleName("what is asked")
        self.list = QListWidget()
        self.list.setAccessibleName("runs")
        for row in runs:
            self.list.addItem(f"{row.name}   {row.says}")
        if begins:
            self.list.addItem(f"begin {begins}")
        self.list.setCurrentRow(0)
        self.list.itemActivated.connect(lambda _: self._take())
        take = QPushButton("Take it (Enter)")
        take.setAccessibleName("Take it")
        take.setDefault(True)
        take.clicked.connect(self._take)
        leave = QPushButton("Close")
        leave.setAccessibleName("Close")
        leave.clicked.connect(self.reject)
        row = QHBoxLayout()
        row.addStretch(1)
        row.addWidget(leave)
        row.addWidget(take)
        whole = QVBoxLayout(self)
        whole.addWidget(says)
        whole.addWidget(self.list)
        note = QLabel("Nothing is attached to yet: Escape closes this list. 'drawcord attach --vent' vents them all.")
        note.setObjectName("status")
        note.setAccessibleName("note")
        note.setWordWrap(True)
        whole.addWidget(note)
        whole.addLayout(row)
        self.list.setFocus(Qt.FocusReason.OtherFocusReason)
        self.resize(760, 320)

    def _take(self) -> None:
        self.chosen = self._names[self.list.currentRow()]
        self.accept()
