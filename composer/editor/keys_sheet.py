"""The sheet of keys, made from the tables of what can be done."""

from PySide6.QtCore import QEvent, QObject, Qt
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QPushButton, QTextBrowser, QVBoxLayout, QWidget

from composer.editor.actions import by_menu, keys_in_words
from composer.picture.cloth import cloth_view

STRAND_KEYS = (
    ("Tab, Shift + Tab", "next or previous knot"),
    ("Return", "take hold of the knot, then let it go where it is"),
    ("← → with a knot held", "move it in time by the grid; with Alt by 5 ms off the grid"),
    ("↑ ↓ with a knot held", "move its target; with Alt in small steps"),
    ("Esc", "put a held knot back"),
    ("← →, Home, End", "play head"),
    ("+ −, 0", "zoom in time, show all"),
)
TEXT_KEYS = (
    ("Tab, Shift + Tab", "indent the line, or take that back; with a list of offers: take the chosen one"),
    ("Ctrl + wheel", "larger or smaller letters"),
)
SNAG_KEYS = (
    ("↑ ↓", "another snag: the cloth goes there"),
    ("Return", "to what would mend it; there: take the choice (its ghost is on the cloth)"),
)
HANG_KEYS = (
    ("F, S, T", "from the front, the side, three-quarter"),
    ("+ −, 0", "nearer, further, the whole rig"),
)

PARTS = (
    ("in the text", TEXT_KEYS),
    ("on the cloth", cloth_view.KEYS),
    ("on the strand", STRAND_KEYS),
    ("in the list of snags", SNAG_KEYS),
    ("on the hanging fibers", HANG_KEYS),
)
"""What keys do in each part of the window, beside those that hold everywhere."""


def rows() -> list[tuple[str, list[tuple[str, str, str]]]]:
    """Every part with its rows: what is done, keys, a sentence."""
    told = []
    for menu, actions in by_menu().items():
        lines = [
            (one.word.replace("&", "").removesuffix(" …"), keys_in_words(one.keys), one.says) for one in actions if one.keys
        ]
        told.append((menu.replace("&", ""), lines))
    return told + [(where, [("", keys, says) for keys, says in lines]) for where, lines in PARTS]


def as_html() -> str:
    """The sheet as a page: one table, so that its columns stand below one another."""
    parts = []
    for name, lines in rows():
        parts.append(f"<tr><td colspan='3' style='padding:12px 4px 4px 4px'><big><b>{_plain(name)}</b></big></td></tr>")
        parts += [
            f"<tr><td style='padding:2px 18px 2px 4px; white-space:nowrap'><b>{_plain(keys)}</b></td>"
            f"<td style='padding:2px 18px 2px 0; white-space:nowrap'>{_plain(word)}</td>"
            f"<td style='padding:2px 4px 2px 0'>{_plain(says)}</td></tr>"
            for word, keys, says in lines
        ]
    return f"<table>{''.join(parts)}</table>"


class KeysSheet(QFrame):
    """The sheet over the window's middle, within the window: the keys are its own whoever manages the windows, or nobody.

    F1 and Escape put it away, and give the keys back to what had them.
    """

    def __init__(self, parent: QWidget):
        super().__init__(parent)
        self.setObjectName("sheet")
        self.setAccessibleName("sheet of keys")
        self._before = parent.focusWidget()
        self._page = QTextBrowser()
        self._page.setAccessibleName("keys")
        self._page.setHtml(as_html())
        self._page.installEventFilter(self)
        title = QLabel("Keys")
        title.setObjectName("title")
        close = QPushButton("Close (Esc)")
        close.setAccessibleName("close the sheet of keys")
        close.clicked.connect(self.put_away)
        head = QHBoxLayout()
        head.addWidget(title, 1)
        head.addWidget(close)
        column = QVBoxLayout(self)
        column.setContentsMargins(10, 8, 10, 8)
        column.addLayout(head)
        column.addWidget(self._page, 1)
        parent.installEventFilter(self)
        self._place()

    def bring(self) -> None:
        """Show it, with the keys."""
        self.show()
        self.raise_()
        self._page.setFocus()

    def put_away(self) -> None:
        """Put it away for good."""
        self.hide()
        if self._before is not None:
            self._before.setFocus()
        self.parentWidget().removeEventFilter(self)
        self.setParent(None)
        self.deleteLater()

    def _place(self) -> None:
        """Over the middle of the window."""
        room = self.parentWidget().rect()
        wide, high = round(room.width() * 0.72), round(room.height() * 0.84)
        self.setGeometry((room.width() - wide) // 2, (room.height() - high) // 2, wide, high)

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Stay in the window's middle; F1 and Escape put it away, also as a shortcut that the window has too."""
        if event.type() == QEvent.Type.Resize and watched is self.parentWidget():
            self._place()
        elif watched is self._page and isinstance(event, QKeyEvent) and event.key() in (Qt.Key.Key_F1, Qt.Key.Key_Escape):
            event.accept()
            if event.type() == QEvent.Type.KeyPress:
                self.put_away()
            return True
        return super().eventFilter(watched, event)


def _plain(text: str) -> str:
    return text.replace("&", "&amp;").replace("<", "&lt;")
