"""Two lines above the text: one that finds words, one that goes to a line, a place or a cue."""

import re
from dataclasses import dataclass

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeyEvent, QTextCursor, QTextDocument
from PySide6.QtWidgets import QCheckBox, QHBoxLayout, QLabel, QLineEdit, QPushButton, QVBoxLayout, QWidget

from composer.editor.pane import TextPane

MOST_FOUND = 1000


class _Line(QWidget):
    """A line of controls that Escape puts away."""

    def __init__(self, pane: TextPane):
        super().__init__()
        self._pane = pane
        self._rows = QVBoxLayout(self)
        self._rows.setContentsMargins(8, 2, 8, 2)
        self._rows.setSpacing(2)
        self._next_row()
        self.hide()

    def _next_row(self) -> None:
        """What is put in from now on stands in a row of its own."""
        self._row = QHBoxLayout()
        self._row.setSpacing(4)
        self._rows.addLayout(self._row)

    def _button(self, word: str, says: str, does) -> QPushButton:
        button = QPushButton(word)
        button.setAccessibleName(says)
        button.setToolTip(says)
        button.clicked.connect(does)
        self._row.addWidget(button)
        return button

    def put_away(self) -> None:
        """Back to the text."""
        self.hide()
        self._pane.setFocus()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Escape puts the line away."""
        if event.key() == Qt.Key.Key_Escape:
            self.put_away()
        else:
            super().keyPressEvent(event)


class FindLine(_Line):
    """Finds a text in the score, from the caret on and round again; can put another in its place."""

    def __init__(self, pane: TextPane):
        super().__init__(pane)
        self.setAccessibleName("find")
        self._word = QLineEdit()
        self._word.setPlaceholderText("find")
        self._word.setAccessibleName("text to find")
        self._word.textChanged.connect(lambda _: self._show())
        self._word.returnPressed.connect(self.next)
        self._row.addWidget(self._word, 2)
        self._count = QLabel()
        self._count.setAccessibleName("how many were found")
        self._row.addWidget(self._count)
        self._button("Back", "the one before (Shift+F3)", self.previous)
        self._button("On", "the next one (F3)", self.next)
        self._case = QCheckBox("as written")
        self._case.setAccessibleName("tell capital letters from small ones")
        self._case.toggled.connect(lambda _: self._show())
        self._row.addWidget(self._case)
        self._button("Close", "put this line away (Escape)", self.put_away)
        self._next_row()
        self._other = QLineEdit()
        self._other.setPlaceholderText("put in its place")
        self._other.setAccessibleName("text to put in its place")
        self._row.addWidget(self._other, 2)
        self._button("Replace", "put the other text in place of the one that is chosen", self.replace)
        self._button("All", "put the other text in place of every one that is found", self.replace_all)

    def open(self) -> None:
        """Show the line, with the word that is chosen in it."""
        chosen = self._pane.textCursor().selectedText()
        if chosen and "\u2029" not in chosen:
            self._word.setText(chosen)
        self.show()
        self._word.setFocus()
        self._word.selectAll()
        self._show()

    def next(self) -> None:
        """Go to the next one."""
        self._go(QTextDocument.FindFlag(0))

    def previous(self) -> None:
        """Go to the one before."""
        self._go(QTextDocument.FindFlag.FindBackward)

    def replace(self) -> None:
        """Put the other text in place of the chosen one, and go on."""
        cursor = self._pane.textCursor()
        chosen, word = cursor.selectedText(), self._word.text()
        if word and (chosen == word or (not self._case.isChecked() and chosen.lower() == word.lower())):
            cursor.insertText(self._other.text())
        self.next()

    def replace_all(self) -> None:
        """Put the other text in place of all, as one step of the history."""
        found = self._found()
        if found:
            editor = QTextCursor(self._pane.document())
            editor.beginEditBlock()
            for cursor in reversed(found):
                cursor.insertText(self._other.text())
            editor.endEditBlock()
        self._show()

    def put_away(self) -> None:
        """Back to the text; nothing is shown as found any more."""
        self._pane.looks.show_found([])
        super().put_away()

    def _flags(self) -> QTextDocument.FindFlag:
        return QTextDocument.FindFlag.FindCaseSensitively if self._case.isChecked() else QTextDocument.FindFlag(0)

    def _found(self) -> list[QTextCursor]:
        word, found = self._word.text(), []
        cursor = QTextCursor(self._pane.document())
        while word and len(found) < MOST_FOUND:
            cursor = self._pane.document().find(word, cursor, self._flags())
            if cursor.isNull():
                break
            found.append(QTextCursor(cursor))
        return found

    def _show(self) -> None:
        found = self._found()
        self._pane.looks.show_found(found)
        count = f"{len(found)}" + ("+" if len(found) == MOST_FOUND else "")
        self._count.setText(f"{count} found" if self._word.text() else "")

    def _go(self, way: QTextDocument.FindFlag) -> None:
        word = self._word.text()
        if not word:
            self.open()
            return
        document, flags = self._pane.document(), self._flags() | way
        cursor = document.find(word, self._pane.textCursor(), flags)
        if cursor.isNull():
            again = QTextCursor(document)
            if way:
                again.movePosition(QTextCursor.MoveOperation.End)
            cursor = document.find(word, again, flags)
        if not cursor.isNull():
            self._pane.setTextCursor(cursor)
            self._pane.ensureCursorVisible()


@dataclass(frozen=True, slots=True)
class Where:
    """Where somebody wants to go: a line and column, a bar and count, seconds, or the name of a cue, section or phrase."""

    line: int = 0
    column: int = 1
    bar: int = 0
    count: float = 1.0
    seconds: float | None = None
    name: str = ""


def read_where(text: str) -> Where | None:
    """What was written into the line: `120`, `line 120`, `9:1`, `12.5s`, `ebb`; None for nothing."""
    text = text.strip()
    if not text:
        return None
    if found := re.fullmatch(r"(?:line\s+)?(\d{1,7})", text, re.IGNORECASE):
        return Where(line=int(found[1]))
    if found := re.fullmatch(r"(\d{1,6}):(\d{1,3}(?:\.\d+)?)", text):
        return Where(bar=int(found[1]), count=float(found[2]))
    if found := re.fullmatch(r"(\d+(?:\.\d+)?)\s*s", text):
        return Where(seconds=float(found[1]))
    return Where(name=text.strip('"'))


class GoLine(_Line):
    """Goes somewhere: says what was asked for as a `Where`."""

    wanted = Signal(object)

    def __init__(self, pane: TextPane):
        super().__init__(pane)
        self.setAccessibleName("go to")
        label = QLabel("Go to")
        self._row.addWidget(label)
        self._word = QLineEdit()
        self._word.setPlaceholderText("a line such as 40, a place such as 9:1, 12.5s, or the name of a cue, section or phrase")
        self._word.setAccessibleName("line, place, or name of a cue, section or phrase")
        self._word.returnPressed.connect(self._go)
        self._row.addWidget(self._word, 1)
        self._button("Go", "go there (Return)", self._go)
        self._button("Close", "put this line away (Escape)", self.put_away)

    def open(self) -> None:
        """Show the line."""
        self.show()
        self._word.setFocus()
        self._word.selectAll()

    def _go(self) -> None:
        where = read_where(self._word.text())
        if where is not None:
            self.hide()
            self._pane.setFocus()
            self.wanted.emit(where)
