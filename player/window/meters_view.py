"""The groups' meters: how far each is up, how far it is wanted, and what the governor cuts off where it cuts."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, QRectF, Qt, Signal
from PySide6.QtGui import QBrush, QKeyEvent, QMouseEvent, QPainter, QPaintEvent
from PySide6.QtWidgets import QWidget

from composer.picture.chrome import scale_of
from composer.picture.look import LEFT, Look, colour, painting, pen
from composer.picture.palette import DARK, Theme
from player.engine.process.layout import Snapshot
from player.engine.process.messages import DISARMED
from player.window.words import cut_said

Array = NDArray[np.float64]

HIGHEST, LOWEST = 44, 20
"""Pixels of a row, at scale 1."""


@dataclass(frozen=True, slots=True)
class Reading:
    """A row: shares of stroke as a mean over its fibers, wanted and allowed; why it is cut, in few letters, and by how much."""

    wanted: float
    allowed: float
    cut: str
    by: float
    touched: bool


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """Groups as rows: their names, the fibers of each; mean (rows, fibers): from strains to each row's mean share of stroke."""

    names: tuple[str, ...]
    of: tuple[NDArray[np.int64], ...]
    mean: Array
    stroke: Array


def rows_of(groups: tuple[tuple[str, NDArray[np.int64]], ...], stroke: Array) -> Rows:
    """Groups (name, fibers) over every fiber's stroke (F,)."""
    mean = np.zeros((len(groups), len(stroke)))
    for row, (_, of) in zip(mean, groups, strict=True):
        np.add.at(row, of, 1.0 / len(of))
    return Rows(tuple(name for name, _ in groups), tuple(of for _, of in groups), mean / stroke, stroke)


def readings(rows: Rows, now: Snapshot) -> tuple[Reading, ...]:
    """What the rows show of a moment; where boards are disarmed nothing is wanted, allowed or cut, whatever was last."""
    if now.state in DISARMED:
        return (Reading(0.0, 0.0, "", 0.0, False),) * len(rows.of)
    wanted = np.clip(rows.mean @ np.nan_to_num(now.array("wanted")), 0.0, 1.0).tolist()
    allowed = np.clip(rows.mean @ np.nan_to_num(now.array("allowed")), 0.0, 1.0).tolist()
    cut, by, touched = now.array("cut"), now.array("by"), now.array("touched")
    cuts = [("", 0.0)] * len(rows.of)
    if cut.any():
        cuts = [cut_said(cut[of], by[of], rows.stroke[of]) for of in rows.of]
    touches = [bool(touched[of].any()) for of in rows.of] if touched.any() else [False] * len(rows.of)
    return tuple(Reading(*each[:2], *each[2], each[3]) for each in zip(wanted, allowed, cuts, touches, strict=True))


class MetersView(QWidget):
    """A row a group; a click on one, or Enter on the chosen one, tells which."""

    group_clicked = Signal(str)

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self._theme: Theme = DARK
        self._rows = rows_of((), np.ones(0))
        self._shown: tuple[Reading, ...] = ()
        self.chosen = -1
        self.setAccessibleName("groups' meters")
        self.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self.setMinimumHeight(60)

    def set_rows(self, rows: tuple[tuple[str, NDArray[np.int64]], ...], stroke: Array) -> None:
        """The groups, and every fiber's stroke."""
        self._rows, self._shown, self.chosen = rows_of(rows, stroke), (), -1
        self.update()

    @property
    def names(self) -> tuple[str, ...]:
        """The rows' names."""
        return self._rows.names

    def set_theme(self, theme: Theme) -> None:
        """Draw in these colours."""
        self._theme = theme
        self.update()

    def show_now(self, now: Snapshot) -> None:
        """The groups as they are now."""
        if len(now.array("wanted")) != len(self._rows.stroke):
            return
        shown = readings(self._rows, now)
        if shown != self._shown:
            self._shown = shown
            if self.isVisible():
                self.update()

    def describe(self) -> str:
        """The meters as sentences."""
        return "; ".join(
            f"{name} {100 * one.allowed:.0f} %" + (f", cut by {one.cut}" if one.cut else "")
            for name, one in zip(self.names, self._shown, strict=False)
        )

    def paintEvent(self, event: QPaintEvent) -> None:
        """Names, bars, what is cut."""
        look = Look(scale_of(self.window().width(), self.window().height()), self._theme)
        with painting(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            painter.fillRect(self.rect(), colour(self._theme.panel))
            high, fits = self._room(look)
            for number, (name, one) in enumerate(zip(self.names, self._shown, strict=False)):
                if number == fits - 1 and len(self.names) > fits:
                    more = f"and {len(self.names) - number} more groups, for which there is no room"
                    box = QRectF(look.px(12), number * high, self.width(), high)
                    look.write(painter, box, more, 14, self._theme.quiet_ink, LEFT)
                    break
                self._row(painter, look, QRectF(0, number * high, self.width(), high), name, one, number)

    def _room(self, look: Look) -> tuple[float, int]:
        rows = max(1, len(self.names))
        high = min(max(self.height() / rows, look.px(LOWEST)), look.px(HIGHEST))
        return high, max(1, int(self.height() / high + 1e-6))

    def _row(self, painter: QPainter, look: Look, box: QRectF, name: str, one: Reading, number: int) -> None:
        theme = self._theme
        letters = min(20.0, 0.5 * box.height() / look.scale)
        if number == self.chosen:
            painter.fillRect(box, colour(theme.raised))
        wide, cut_wide = look.px(112), look.px(104)
        pad = look.px(12)
        painter.setFont(look.font(letters, one.touched))
        painter.setPen(colour(theme.chosen if one.touched else theme.ink))
        shown = painter.fontMetrics().elidedText(name, Qt.TextElideMode.ElideRight, wide)
        left = Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter
        painter.drawText(QRectF(pad, box.top(), wide, box.height()), left, shown)
        bar = QRectF(pad + wide + look.px(6), box.top() + box.height() * 0.22, 0, box.height() * 0.56)
        bar.setRight(box.right() - pad - cut_wide)
        if bar.width() < 8:
            return
        painter.setPen(pen(theme.edge, max(1.0, look.scale)))
        painter.setBrush(colour(theme.field))
        painter.drawRect(bar)
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(colour(theme.supply))
        painter.drawRect(QRectF(bar.left(), bar.top(), bar.width() * one.allowed, bar.height()))
        if one.cut and abs(one.wanted - one.allowed) > 0.004:
            low, high = sorted((one.wanted, one.allowed))
            piece = QRectF(bar.left() + bar.width() * low, bar.top(), bar.width() * (high - low), bar.height())
            painter.setBrush(colour(theme.fault))
            painter.drawRect(piece)
            painter.setBrush(QBrush(colour(theme.field), Qt.BrushStyle.BDiagPattern))
            painter.drawRect(piece)
        x = bar.left() + bar.width() * one.wanted
        painter.setPen(pen(theme.head, max(2.0, 2.5 * look.scale)))
        painter.drawLine(QPointF(x, bar.top() - look.px(3)), QPointF(x, bar.bottom() + look.px(3)))
        says = f"{one.cut} −{100 * one.by:.0f} %" if one.cut else f"{100 * one.allowed:.0f} %"
        end = QRectF(box.right() - pad - cut_wide, box.top(), cut_wide, box.height())
        painter.setFont(look.font(letters, bool(one.cut)))
        painter.setPen(colour(theme.fault if one.cut else theme.ink))
        painter.drawText(end, Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter, says)

    def row_at(self, y: float) -> int:
        """The row at a height, -1 for none."""
        look = Look(scale_of(self.window().width(), self.window().height()), self._theme)
        high, fits = self._room(look)
        number = int(y // high)
        last = fits - 1 if len(self.names) > fits else len(self.names)
        return number if 0 <= number < min(last, len(self.names)) else -1

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """A click says which group."""
        self._choose(self.row_at(event.position().y()), True)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Up and down choose a row, Enter says which."""
        step = {Qt.Key.Key_Down: 1, Qt.Key.Key_Up: -1}.get(event.key(), 0)
        if step:
            self._choose(min(max(self.chosen + step, 0), len(self.names) - 1), False)
        elif event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and self.chosen >= 0:
            self._choose(self.chosen, True)
        else:
            super().keyPressEvent(event)

    def _choose(self, row: int, tell: bool) -> None:
        self.chosen = row
        if row >= 0:
            self.setAccessibleDescription(self.names[row])
            if tell:
                self.group_clicked.emit(self.names[row])
        self.update()
