"""How the text looks: colours of its words, what is wrong with a line and behind it, lines that are lit, what was found.

Only lines in view are coloured, each when it comes into view or changes, so that a text of any length costs the same.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import (
    QColor,
    QFont,
    QFontMetricsF,
    QPainter,
    QPaintEvent,
    QTextBlock,
    QTextCharFormat,
    QTextCursor,
    QTextFormat,
    QTextLayout,
)
from PySide6.QtWidgets import QTextEdit

from composer.editor.deltas import units_in
from composer.editor.text_colours import formats
from composer.edits.colouring import block_after, block_of, colour_line
from composer.picture.palette import DARK, Theme
from composer.score.bounds import most

if TYPE_CHECKING:
    from composer.editor.pane import TextPane

LEAST_LETTERS = 12
"""Letters that must find room behind a line for what is wrong with it to be written there."""

FURTHEST = 3000
"""Lines that are looked back over for the block that a line stands in."""


@dataclass(frozen=True, slots=True)
class Mark:
    """Something wrong with a line: columns, from 1, `start` to before `end` (0 and 0 for all of it), and what is wrong."""

    line: int
    start: int
    end: int
    says: str


class Looks:
    """The looks of one text pane."""

    def __init__(self, pane: "TextPane"):
        self._pane = pane
        self._theme = DARK
        self._formats = formats(DARK)
        self._marks: dict[int, list[Mark]] = {}
        self._lit: frozenset[int] = frozenset()
        self._lit_more: frozenset[int] = frozenset()
        self._found: list[QTextCursor] = []

    @property
    def theme(self) -> Theme:
        """The colours in use."""
        return self._theme

    @property
    def lit(self) -> frozenset[int]:
        """All lines that are lit."""
        return self._lit | self._lit_more

    def set_theme(self, theme: Theme) -> None:
        """Show the text in these colours."""
        self._theme = theme
        self._formats = formats(theme)
        block = self._pane.document().firstBlock()
        while block.isValid():
            block.setUserState(-1)
            block = block.next()
        self.colour_seen()
        self.show_extras()
        self._pane.gutter.update()

    def set_marks(self, marks: Sequence[Mark]) -> None:
        """Mark what is wrong, and nothing else."""
        self._marks = {}
        for mark in marks:
            self._marks.setdefault(mark.line, []).append(mark)
        self.show_extras()
        self._pane.gutter.update()

    @property
    def marks(self) -> dict[int, list[Mark]]:
        """What is marked, by line."""
        return self._marks

    def light(self, lines: Sequence[int], more: Sequence[int] = ()) -> None:
        """Light whole lines, and more of them less so; no others."""
        lit = (frozenset(lines), frozenset(more) - frozenset(lines))
        if lit != (self._lit, self._lit_more):
            self._lit, self._lit_more = lit
            self.show_extras()
            self._pane.gutter.update()

    def show_found(self, found: list[QTextCursor]) -> None:
        """Show where something was found."""
        self._found = found
        self.show_extras()

    def show_extras(self) -> None:
        """Show anew what lies over the text."""
        extras = []
        for lines, strength in ((self._lit_more, 34), (self._lit, 70)):
            for line in list(lines)[:400]:
                form = QTextCharFormat()
                form.setBackground(QColor(*self._theme.chosen, strength))
                form.setProperty(QTextFormat.Property.FullWidthSelection, True)
                extras.append(_extra(QTextCursor(self._pane.document().findBlockByNumber(line - 1)), form))
        for cursor in self._found[:1000]:
            form = QTextCharFormat()
            form.setBackground(QColor(*self._theme.caution, 90))
            extras.append(_extra(cursor, form))
        form = QTextCharFormat()
        form.setUnderlineStyle(QTextCharFormat.UnderlineStyle.WaveUnderline)
        form.setUnderlineColor(QColor(*self._theme.fault))
        for line, marks in list(self._marks.items())[:500]:
            block = self._pane.document().findBlockByNumber(line - 1)
            for mark in marks:
                if not mark.start or not block.isValid():
                    continue
                cursor = QTextCursor(block)
                last = max(0, block.length() - 1)
                begin = min(unit_of(block, mark.start), max(0, last - 1))
                cursor.setPosition(block.position() + begin)
                end = min(max(unit_of(block, mark.end), begin + 1), last)
                cursor.setPosition(block.position() + end, QTextCursor.MoveMode.KeepAnchor)
                extras.append(_extra(cursor, form))
        self._pane.setExtraSelections(extras)

    def colour_seen(self) -> None:
        """Colour the lines in view that are not, or stand in another block than when they were."""
        block = self._pane.firstVisibleBlock()
        if not block.isValid():
            return
        within = self._block_of(block)
        height = self._pane.viewport().height()
        top = self._pane.blockBoundingGeometry(block).translated(self._pane.contentOffset()).top()
        document = self._pane.document()
        was, self._pane.silent = self._pane.silent, True
        while block.isValid() and top <= height:
            text = block.text()
            state = hash((text, within)) & 0x3FFFFFFF
            if block.userState() != state:
                block.setUserState(state)
                block.layout().setFormats(self._ranges(text, block_of(text, within)))
                document.markContentsDirty(block.position(), block.length())
            within = block_after(text, within)
            top += self._pane.blockBoundingRect(block).height()
            block = block.next()
        self._pane.silent = was

    def _ranges(self, text: str, within: str) -> list[QTextLayout.FormatRange]:
        plain = text.isascii()
        ranges = []
        for start, end, name in colour_line(text[: most("line")], within):
            form = self._formats.get(name)
            if form is None:
                continue
            one = QTextLayout.FormatRange()
            one.start = start if plain else units_in(text[:start])
            one.length = (end if plain else units_in(text[:end])) - one.start
            one.format = form
            ranges.append(one)
        return ranges

    def _block_of(self, block: QTextBlock) -> str:
        """The block that is open where a line begins: told by the nearest statement above it."""
        above = block.previous()
        left = FURTHEST
        while above.isValid() and left:
            text = above.text()
            if text[:1] not in ("", " ", "\t", "#"):
                return block_after(text, "")
            above, left = above.previous(), left - 1
        return ""

    def paint_marks(self, event: QPaintEvent) -> None:
        """Behind the end of each line that is wrong, say what is wrong with it."""
        pane = self._pane
        if not self._marks:
            return
        painter = QPainter(pane.viewport())
        font = QFont(pane.font())
        font.setItalic(True)
        painter.setFont(font)
        metrics = QFontMetricsF(font)
        painter.setPen(QColor(*self._theme.fault))
        block = pane.firstVisibleBlock()
        offset = pane.contentOffset()
        top = pane.blockBoundingGeometry(block).translated(offset).top()
        while block.isValid() and top <= event.rect().bottom():
            height = pane.blockBoundingRect(block).height()
            marks = self._marks.get(block.blockNumber() + 1)
            if marks and top + height >= event.rect().top():
                x = offset.x() + block.layout().lineAt(0).naturalTextWidth() + metrics.horizontalAdvance("   ")
                room = pane.viewport().width() - x - 6
                # Never over the text: where there is no room, the foot of the window and the pointer say it.
                if room < metrics.horizontalAdvance("m") * LEAST_LETTERS:
                    x = room = 0.0
                says = metrics.elidedText("\u25b2 " + marks[0].says, Qt.TextElideMode.ElideRight, room)
                if room:
                    painter.drawText(QRectF(x, top, room, height), Qt.AlignmentFlag.AlignVCenter, says)
            top += height
            block = block.next()
        painter.end()


def unit_of(block: QTextBlock, column: int) -> int:
    """Where a column, from 1, begins in a line, in code units."""
    return min(units_in(block.text()[: max(0, column - 1)]), max(0, block.length() - 1))


def _extra(cursor: QTextCursor, form: QTextCharFormat) -> QTextEdit.ExtraSelection:
    made = QTextEdit.ExtraSelection()
    made.cursor, made.format = cursor, form
    return made
