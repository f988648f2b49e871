"""The pre-flight as a list: each line waits, is in order, or says what is wrong and what to do; cautions; tonight's margins."""

from collections.abc import Sequence
from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QBrush, QFont
from PySide6.QtWidgets import QAbstractItemView, QListWidget, QListWidgetItem, QWidget

from composer.picture.look import colour
from composer.picture.palette import DARK, Theme

WAITS = "the boards are asked …"

Row = tuple[str, str, str]
"""Kind of mark, text, and what to do about it."""

MARKS = {"ok": "ok", "no": "NO", "waits": "…", "caution": "!", "margin": "»", "head": ""}
"""The mark of each kind, in letters."""


def rows_of(
    marks: Sequence[dict[str, Any]] | None, cautions: Sequence[str], margins: Sequence[str], wrong: Sequence[str] = ()
) -> list[Row]:
    """The list's rows: marks as the run told them, None while they are asked; what kept the run from coming about."""
    rows: list[Row] = [("no", line.strip(), "") for line in wrong if line.strip()]
    if marks is None and not wrong:
        rows.append(("waits", WAITS, ""))
    # What is wrong comes first: a long list may be longer than the window.
    told = [
        ("ok" if one["ok"] else "no", one["asked"] + (f" ({one['found']})" if one["found"] else ""),
         "" if one["ok"] else one["hint"])
        for one in marks or ()
    ]  # fmt: skip
    rows += [row for row in told if row[0] == "no"]
    rows += [("caution", line, "") for line in cautions]
    rows += [row for row in told if row[0] == "ok"]
    if margins:
        rows.append(("head", "What the fibers will do tonight, as simulated", ""))
        rows += [("margin", line, "") for line in margins]
    return rows


class PreflightView(QListWidget):
    """Shows the rows."""

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self._theme: Theme = DARK
        self._rows: list[Row] = []
        self.setAccessibleName("pre-flight")
        self.setWordWrap(True)
        self.setSelectionMode(QAbstractItemView.SelectionMode.NoSelection)
        self.setVerticalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setFocusPolicy(Qt.FocusPolicy.TabFocus)

    @property
    def rows(self) -> list[Row]:
        """What is shown."""
        return list(self._rows)

    def show_rows(self, rows: list[Row]) -> None:
        """Show other rows; those from the first one on that is another are made anew."""
        if rows != self._rows:
            pairs = enumerate(zip(rows, self._rows, strict=False))
            same = next((place for place, (one, other) in pairs if one != other), min(len(rows), len(self._rows)))
            self._rows = rows
            self._fill(same)

    def set_theme(self, theme: Theme) -> None:
        """Draw in these colours."""
        self._theme = theme
        self._fill()

    def _fill(self, same: int = 0) -> None:
        theme = self._theme
        of = {
            "ok": theme.good, "no": theme.fault, "waits": theme.quiet_ink, "caution": theme.caution, "margin": theme.ink,
            "head": theme.quiet_ink,
        }  # fmt: skip
        while self.count() > same:
            self.takeItem(self.count() - 1)
        for kind, text, hint in self._rows[same:]:
            mark = MARKS[kind]
            item = QListWidgetItem(f"{mark}  {text}" if mark else text)
            if hint:
                item.setText(f"{item.text()}\n      → {hint}")
            item.setForeground(QBrush(colour(of[kind])))
            item.setFlags(Qt.ItemFlag.ItemIsEnabled)
            font = QFont(self.font())
            font.setBold(kind in ("no", "caution", "head"))
            item.setFont(font)
            self.addItem(item)
