"""The sheet of keys, from the table of actions."""

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QDialog, QGridLayout, QLabel, QPushButton, QScrollArea, QVBoxLayout, QWidget

from player.window.actions import sheet
from player.window.parted import Parted, beside_vent


class KeySheet(QDialog):
    """Every key and what it does. Escape vents here too; Enter closes it."""

    def __init__(self, parent: Parted):
        super().__init__(parent)
        self.setWindowTitle("Keys")
        self.setAccessibleName("sheet of keys")
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        inside = QWidget()
        grid = QGridLayout(inside)
        grid.setColumnStretch(2, 1)
        grid.setHorizontalSpacing(24)
        for row, (keys, word, says) in enumerate(sheet()):
            for column, text in enumerate((keys, word, says)):
                label = QLabel(text)
                label.setTextFormat(Qt.TextFormat.PlainText)
                label.setAccessibleName(text)
                label.setObjectName("name" if column == 2 else "value")
                label.setWordWrap(column == 2)
                grid.addWidget(label, row, column, Qt.AlignmentFlag.AlignTop)
        area = QScrollArea()
        area.setWidget(inside)
        area.setWidgetResizable(True)
        close = QPushButton("Close (Enter)")
        close.setAccessibleName("Close")
        close.setDefault(True)
        close.clicked.connect(self.close)
        whole = QVBoxLayout(self)
        whole.addWidget(area)
        whole.addWidget(close)
        beside_vent(self, parent, foot=True)
