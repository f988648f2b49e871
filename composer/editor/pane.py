"""The text: a plain editor that tells of each change as it is made, and shows what is known of its lines."""

from collections.abc import Sequence

from PySide6.QtCore import QEvent, QMimeData, QPoint, QRect, Qt, QTimer, Signal
from PySide6.QtGui import (
    QKeyEvent,
    QPaintEvent,
    QResizeEvent,
    QTextBlock,
    QTextCursor,
    QTextOption,
    QWheelEvent,
)
from PySide6.QtWidgets import QPlainTextEdit, QWidget

from composer.editor.deltas import Delta
from composer.editor.gutter import Gutter
from composer.editor.looks import Looks, unit_of
from composer.edits.colouring import block_after
from composer.score.bounds import most

INDENT = "  "


class TextPane(QPlainTextEdit):
    """The score's text.

    changed: a change, as it is made; refused: a sentence on why something was not taken
    placed: the caret's line and column, from 1, when it has come to rest there
    typed: a character that was typed; letters_wanted: 1 for larger letters, -1 for smaller
    asked: line, column and where on the screen, when somebody wants to know what a word means
    """

    changed = Signal(object)
    refused = Signal(str)
    placed = Signal(int, int)
    asked = Signal(int, int, QPoint)
    typed = Signal(str)
    letters_wanted = Signal(int)

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self._units = 0
        self.silent = False
        self.looks = Looks(self)
        self.setLineWrapMode(QPlainTextEdit.LineWrapMode.NoWrap)
        self.setWordWrapMode(QTextOption.WrapMode.NoWrap)
        self.setAccessibleName("score text")
        self.setAccessibleDescription("The score as text. Control and Space completes a word; F1 shows all keys.")
        self.setTabChangesFocus(False)
        self.setCursorWidth(2)
        self.setObjectName("score")
        self.gutter = Gutter(self)
        self._rest = QTimer(self)
        self._rest.setSingleShot(True)
        self._rest.setInterval(60)
        self._rest.timeout.connect(self._tell_place)
        self._soon = QTimer(self)
        self._soon.setSingleShot(True)
        self._soon.setInterval(0)
        self._soon.timeout.connect(self.looks.colour_seen)
        self.document().contentsChange.connect(self._contents_change)
        self.cursorPositionChanged.connect(self._caret_moved)
        self.verticalScrollBar().valueChanged.connect(self.looks.colour_seen)
        self.blockCountChanged.connect(self._make_room)
        self.updateRequest.connect(self._move_gutter)
        self._make_room()

    # ---- the text -------------------------------------------------------------------------------------------------------

    @property
    def text(self) -> str:
        """The whole text, with plain line feeds; nothing in it is made into something else."""
        return self.document().toRawText().replace("\u2029", "\n").replace("\ufdd0", "\n").replace("\ufdd1", "\n")

    def open_text(self, text: str) -> None:
        """Begin with another text; what was done before cannot be undone any more, and no change is told."""
        self.silent = True
        self.document().setPlainText(text)
        self.silent = False
        self._units = self.document().characterCount() - 1
        self.document().setModified(False)
        self.looks.set_marks([])
        self.moveCursor(QTextCursor.MoveOperation.Start)
        self.looks.colour_seen()

    def change(self, deltas: Sequence[Delta]) -> None:
        """Make changes, in any order and none over another, as one step of the history; the caret stays with its text."""
        cursor = QTextCursor(self.document())
        # Undo puts the caret where the block began.
        cursor.setPosition(min((delta.at for delta in deltas), default=0))
        cursor.beginEditBlock()
        for delta in sorted(deltas, key=lambda one: one.at, reverse=True):
            cursor.setPosition(delta.at)
            cursor.setPosition(delta.at + delta.out, QTextCursor.MoveMode.KeepAnchor)
            cursor.insertText(delta.put)
        cursor.endEditBlock()

    def _contents_change(self, at: int, out: int, put: int) -> None:
        if self.silent:
            return
        units = self.document().characterCount() - 1
        put = min(put, units - at)
        out = min(out, self._units - at)
        cursor = QTextCursor(self.document())
        if self._units - out + put != units:
            at, out, put = 0, self._units, units
        cursor.setPosition(at)
        cursor.setPosition(at + put, QTextCursor.MoveMode.KeepAnchor)
        self._units = units
        self.changed.emit(Delta(at, out, cursor.selectedText().replace("\u2029", "\n")))
        # The layout is still being changed here; colours come when that is done.
        self._soon.start()

    # ---- where things are -----------------------------------------------------------------------------------------------

    @property
    def place(self) -> tuple[int, int]:
        """The caret's line and column, from 1, in characters."""
        cursor = self.textCursor()
        return cursor.blockNumber() + 1, self._column(cursor.block(), cursor.positionInBlock())

    def go_to(self, line: int, column: int = 1, length: int = 0, focus: bool = True) -> None:
        """Put the caret there, with so many characters chosen, and show it in the middle where it was out of sight."""
        block = self.document().findBlockByNumber(max(0, min(line, self.blockCount()) - 1))
        cursor = QTextCursor(block)
        cursor.setPosition(block.position() + unit_of(block, column))
        if length:
            end = block.position() + unit_of(block, column + length)
            cursor.setPosition(end, QTextCursor.MoveMode.KeepAnchor)
        seen = self._is_seen(block)
        self.setTextCursor(cursor)
        if not seen:
            self.centerCursor()
        if focus:
            self.setFocus()

    def show_line(self, line: int) -> None:
        """Bring a line into view, wherever the caret is."""
        block = self.document().findBlockByNumber(line - 1)
        if block.isValid() and not self._is_seen(block):
            self.verticalScrollBar().setValue(max(0, block.blockNumber() - 4))

    def words_before(self) -> str:
        """What of the caret's line stands before it."""
        cursor = self.textCursor()
        return cursor.block().text()[: cursor.positionInBlock()]

    def replace_columns(self, line: int, start: int, end: int, text: str) -> None:
        """Put a text in place of columns of a line, and the caret behind it."""
        block = self.document().findBlockByNumber(line - 1)
        cursor = QTextCursor(block)
        cursor.setPosition(block.position() + unit_of(block, start))
        cursor.setPosition(block.position() + unit_of(block, end), QTextCursor.MoveMode.KeepAnchor)
        cursor.insertText(text)
        self.setTextCursor(cursor)

    def _tell_place(self) -> None:
        self.placed.emit(*self.place)

    def _caret_moved(self) -> None:
        self._rest.start()
        self.gutter.update()

    @staticmethod
    def _column(block: QTextBlock, units: int) -> int:
        text = block.text()
        if text.isascii():
            return units + 1
        return len(text.encode("utf-16-le", "surrogatepass")[: 2 * units].decode("utf-16-le", "replace")) + 1

    def _is_seen(self, block: QTextBlock) -> bool:
        top = self.blockBoundingGeometry(block).translated(self.contentOffset()).top()
        return 0 <= top <= self.viewport().height() - self.fontMetrics().height()

    # ---- painting -------------------------------------------------------------------------------------------------------

    def paintEvent(self, event: QPaintEvent) -> None:
        """Over the text, what is wrong with its lines."""
        super().paintEvent(event)
        self.looks.paint_marks(event)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the line numbers beside the text, and the caret in view where it was, such as when a notice comes up above."""
        seen = self.cursorRect().top() >= 0 and self.cursorRect().bottom() <= event.oldSize().height()
        super().resizeEvent(event)
        if seen and self.cursorRect().bottom() > self.viewport().height():
            self.ensureCursorVisible()
        self._place_gutter()
        self.looks.colour_seen()

    def _place_gutter(self) -> None:
        box = self.contentsRect()
        self.gutter.setGeometry(QRect(box.left(), box.top(), self.gutter.needs(), box.height()))

    def _make_room(self) -> None:
        self.setViewportMargins(self.gutter.needs(), 0, 0, 0)

    def _move_gutter(self, box: QRect, dy: int) -> None:
        if dy:
            self.gutter.scroll(0, dy)
        else:
            self.gutter.update(0, box.y(), self.gutter.width(), box.height())

    # ---- keys and pointer -----------------------------------------------------------------------------------------------

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Return keeps the indent of a block, twice ends the block; Tab indents, Shift and Tab takes that back."""
        plain = event.modifiers() in (Qt.KeyboardModifier.NoModifier, Qt.KeyboardModifier.KeypadModifier)
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and plain:
            self._new_line()
        elif event.key() == Qt.Key.Key_Tab and plain:
            self._indent()
        elif event.key() == Qt.Key.Key_Backtab:
            self._outdent()
        else:
            super().keyPressEvent(event)
            if event.text() and event.text().isprintable() and plain | (event.modifiers() == Qt.KeyboardModifier.ShiftModifier):
                self.typed.emit(event.text())
            return
        self.ensureCursorVisible()

    def _new_line(self) -> None:
        cursor = self.textCursor()
        before = cursor.block().text()[: cursor.positionInBlock()]
        lead = before[: len(before) - len(before.lstrip(" \t"))]
        if before.strip() and not lead and block_after(before, ""):
            lead = INDENT
        if not before.strip() and not cursor.hasSelection():
            if cursor.block().text().strip():
                lead = before
            else:
                # Nothing stands on this line: the block is over, and the blanks that began it go.
                cursor.movePosition(QTextCursor.MoveOperation.StartOfBlock)
                cursor.movePosition(QTextCursor.MoveOperation.EndOfBlock, QTextCursor.MoveMode.KeepAnchor)
                lead = ""
        cursor.insertText("\n" + lead)
        self.setTextCursor(cursor)

    def _lines_chosen(self) -> list[QTextBlock]:
        cursor = self.textCursor()
        first = self.document().findBlock(cursor.selectionStart())
        last = self.document().findBlock(max(cursor.selectionStart(), cursor.selectionEnd() - 1))
        blocks = [first]
        while blocks[-1].isValid() and blocks[-1].blockNumber() < last.blockNumber():
            blocks.append(blocks[-1].next())
        return blocks

    def _indent(self) -> None:
        cursor = self.textCursor()
        if not cursor.hasSelection():
            # To the next column that is a multiple of two, as blocks and their columns are laid out.
            cursor.insertText(" " * (2 - cursor.positionInBlock() % 2))
            self.setTextCursor(cursor)
            return
        self.change([Delta(block.position(), 0, INDENT) for block in self._lines_chosen() if block.text().strip()])

    def _outdent(self) -> None:
        deltas = []
        for block in self._lines_chosen():
            text = block.text()
            count = min(2, len(text) - len(text.lstrip(" ")))
            if count:
                deltas.append(Delta(block.position(), count, ""))
        self.change(deltas)

    def toggle_comment(self) -> None:
        """Make the lines chosen comments, or take that back where all are."""
        blocks = [block for block in self._lines_chosen() if block.text().strip()]
        if all(block.text().lstrip().startswith("#") for block in blocks):
            deltas = []
            for block in blocks:
                text = block.text()
                at = text.index("#")
                deltas.append(Delta(block.position() + at, 2 if text[at + 1 : at + 2] == " " else 1, ""))
        else:
            least = min((len(b.text()) - len(b.text().lstrip()) for b in blocks), default=0)
            deltas = [Delta(block.position() + least, 0, "# ") for block in blocks]
        self.change(deltas)

    def insertFromMimeData(self, source: QMimeData) -> None:
        """Paste text alone, and no more than a score may have."""
        room = most("file") - self._units
        # Counted before it is made into a text, which alone would take its time.
        size = source.data("text/plain").size() or len(source.text())
        if size > room:
            self.refused.emit(
                f"That is {size:,} bytes; a score may have {most('file'):,}, and this one has room for {max(room, 0):,}. "
                "Nothing was pasted."
            )
            return
        text = source.text()
        lines = text.count("\n") + self.blockCount()
        if lines > most("lines"):
            self.refused.emit(f"The score would have {lines:,} lines then; it may have {most('lines'):,}. Nothing was pasted.")
            return
        cursor = self.textCursor()
        cursor.insertText(text.replace("\r\n", "\n").replace("\r", "\n").replace("\0", ""))
        self.setTextCursor(cursor)
        self.ensureCursorVisible()

    def canInsertFromMimeData(self, source: QMimeData) -> bool:
        """Text, and nothing else."""
        return source.hasText()

    def wheelEvent(self, event: QWheelEvent) -> None:
        """With Control the wheel makes letters larger or smaller."""
        if event.modifiers() & Qt.KeyboardModifier.ControlModifier:
            self.letters_wanted.emit(1 if event.angleDelta().y() > 0 else -1)
        else:
            super().wheelEvent(event)

    def changeEvent(self, event: QEvent) -> None:
        """Other letters want another margin."""
        super().changeEvent(event)
        if event.type() in (QEvent.Type.FontChange, QEvent.Type.StyleChange):
            self._make_room()
            self._place_gutter()
            self.looks.colour_seen()

    def event(self, event) -> bool:
        """A pointer that rests on a word asks what it means."""
        if event.type() == event.Type.ToolTip:
            cursor = self.cursorForPosition(self.viewport().mapFrom(self, event.pos()))
            column = self._column(cursor.block(), cursor.positionInBlock())
            self.asked.emit(cursor.blockNumber() + 1, column, event.globalPos())
            return True
        return super().event(event)

    def ask_here(self) -> None:
        """Ask what the word at the caret means."""
        box = self.cursorRect()
        self.asked.emit(*self.place, self.viewport().mapToGlobal(box.bottomLeft()))
