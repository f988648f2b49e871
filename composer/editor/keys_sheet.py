"""The sheet of keys, made from the tables of what can be done."""

from PySide6.QtCore import Qt
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import QDialog, QTextBrowser, QVBoxLayout, QWidget

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
    """The sheet as a page."""
    parts = []
    for name, lines in rows():
        body = "".join(
            f"<tr><td style='padding:2px 18px 2px 4px; white-space:nowrap'><b>{_plain(keys)}</b></td>"
            f"<td style='padding:2px 18px 2px 0; white-space:nowrap'>{_plain(word)}</td><td>{_plain(says)}</td></tr>"
            for word, keys, says in lines
        )
        parts.append(f"<h3>{_plain(name)}</h3><table>{body}</table>")
    return "".join(parts)


class KeysSheet(QDialog):
    """The sheet in a window of its own, which need not be closed to go on."""

    def __init__(self, parent: QWidget):
        super().__init__(parent)
        self.setWindowTitle("Keys")
        self.setModal(False)
        page = QTextBrowser()
        page.setAccessibleName("keys")
        page.setHtml(as_html())
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.addWidget(page)
        self.resize(round(parent.width() * 0.62), round(parent.height() * 0.8))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """F1 puts it away as it brought it."""
        if event.key() in (Qt.Key.Key_F1, Qt.Key.Key_Escape):
            self.close()
        else:
            super().keyPressEvent(event)


def _plain(text: str) -> str:
    return text.replace("&", "&amp;").replace("<", "&lt;")
