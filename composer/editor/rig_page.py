"""The rig as a page: what each fiber can do where it hangs, on which channel, and what is wrong with its file."""

from collections.abc import Sequence
from typing import Any

import numpy as np
from PySide6.QtCore import QAbstractTableModel, QModelIndex, Qt, Signal
from PySide6.QtGui import QFontMetrics
from PySide6.QtWidgets import QAbstractItemView, QFrame, QLabel, QSplitter, QTableView, QVBoxLayout, QWidget

from composer.faults import Fault
from composer.limits.abilities import Abilities
from composer.limits.tables import travel_time_s
from composer.picture.palette import Theme
from composer.picture.plots.able_view import AbleView
from composer.picture.units import unit_of
from composer.rig.model import Rig

HEADINGS = (
    ("fiber", "its name in a score"),
    ("type", "of fiber"),
    ("valve", "type"),
    ("board, channel", "where its valve is connected"),
    ("hangs at, m", "x to the right, y away, z up"),
    ("stroke", "% of its length, and in its own unit"),
    ("force, N", "at rest, at full pressure"),
    ("fill, s", "a full stroke as fast as it goes"),
    ("exhaust, s", "back again as fast as it goes"),
    ("air, mL", "of one fill, as free air"),
    ("hold, s", "above half stroke at most"),
)
WORDS = 5
"""Columns from the left that are words."""

FIGURE_SPACE = "\u2007"
"""A space as wide as a digit, so that numbers stand below one another."""

MOST_FAULTS = 8


class _Fibers(QAbstractTableModel):
    """A row a fiber."""

    def __init__(self, rig: Rig, abilities: Abilities):
        super().__init__()
        self.rig, self.abilities = rig, abilities
        each = np.arange(len(rig.fibers))
        rest, full = np.zeros(len(each)), abilities.stroke
        self._fill, self._exhaust = travel_time_s(abilities, each, rest, full), travel_time_s(abilities, each, full, rest)

    def rowCount(self, parent: QModelIndex | None = None) -> int:
        """How many fibers."""
        return len(self.rig.fibers)

    def columnCount(self, parent: QModelIndex | None = None) -> int:
        """How many things are told of each."""
        return len(HEADINGS)

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """What a column tells."""
        if orientation != Qt.Orientation.Horizontal:
            return None
        return {Qt.ItemDataRole.DisplayRole: HEADINGS[section][0], Qt.ItemDataRole.ToolTipRole: HEADINGS[section][1]}.get(role)

    def data(self, index: QModelIndex, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """One thing of one fiber."""
        if role == Qt.ItemDataRole.DisplayRole:
            return self._text(index.row(), index.column())
        if role == Qt.ItemDataRole.AccessibleTextRole:
            return f"{HEADINGS[index.column()][0]} {self._text(index.row(), index.column())}"
        if role == Qt.ItemDataRole.TextAlignmentRole:
            side = Qt.AlignmentFlag.AlignLeft if index.column() < WORDS else Qt.AlignmentFlag.AlignRight
            return int(side | Qt.AlignmentFlag.AlignVCenter)
        return None

    def _text(self, row: int, column: int) -> str:
        fiber, abilities = self.rig.fibers[row], self.abilities
        able = abilities.capabilities[abilities.which[row]]
        per_strain, unit = unit_of(abilities, row)
        stroke, hold = float(abilities.stroke[row]), float(abilities.max_hold_s[row])
        return (
            fiber.name,
            fiber.type.name,
            fiber.mounting.valve.name,
            f"{fiber.driver} {fiber.channel}",
            "".join(f"{value:7.2f}" for value in fiber.at_m).replace(" ", FIGURE_SPACE),
            f"{100.0 * stroke:.1f} %, {stroke * per_strain:.1f} {unit}",
            "-" if able.force_N is None else f"{able.force_N:.1f}",
            f"{self._fill[row]:.2f}",
            f"{self._exhaust[row]:.2f}",
            f"{1e3 * able.air_L[-1]:.1f}",
            "-" if not np.isfinite(hold) else f"{hold:g}",
        )[column]


class RigPage(QWidget):
    """The rig's fibers as a table. fiber_chosen: a row was chosen."""

    fiber_chosen = Signal(int)

    def __init__(self) -> None:
        super().__init__()
        self.setAccessibleName("rig")
        self._head = QLabel()
        self._head.setAccessibleName("the rig's name and supply")
        self._head.setContentsMargins(10, 6, 10, 6)
        self._head.setWordWrap(True)
        self._wrong = QFrame()
        self._wrong.setObjectName("fault")
        inner = QVBoxLayout(self._wrong)
        self._says = QLabel()
        self._says.setWordWrap(True)
        self._says.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self._says.setAccessibleName("what is wrong with the rig's file")
        inner.addWidget(self._says)
        self._wrong.hide()
        self.table = QTableView()
        self.table.setAccessibleName("fibers of the rig")
        self.table.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.table.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
        self.table.verticalHeader().hide()
        self.table.setShowGrid(False)
        self.table.setTabKeyNavigation(False)
        self.rates = AbleView()
        split = QSplitter(Qt.Orientation.Vertical)
        split.addWidget(self.table)
        split.addWidget(self.rates)
        split.setStretchFactor(0, 3)
        split.setStretchFactor(1, 2)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        for part, stretch in ((self._head, 0), (self._wrong, 0), (split, 1)):
            column.addWidget(part, stretch)
        self._fibers: _Fibers | None = None

    def show_rig(self, rig: Rig, abilities: Abilities) -> None:
        """Show a rig."""
        supply = rig.supply
        what = (
            f"water at {supply.pressure_kPa:g} kPa, pump {supply.compressor_L_min:g} L/min"
            if supply.medium == "water"
            else f"air at {supply.pressure_kPa:g} kPa, receiver {supply.receiver_L:g} L from {supply.max_receiver_kPa:g} "
            f"down to {supply.min_pressure_kPa:g} kPa, compressor {supply.compressor_L_min:g} L/min"
        )
        self._head.setText(f"<b>{_plain(rig.name)}</b>  {len(rig.fibers)} fibers, {what}  ({_plain(rig.file)})")
        self._fibers = _Fibers(rig, abilities)
        self.table.setModel(self._fibers)
        self._widen()
        self.table.selectionModel().currentRowChanged.connect(self._chosen)
        if rig.fibers:
            self.rates.show_fiber(rig, abilities, 0)

    def show_faults(self, faults: Sequence[Fault]) -> None:
        """Say what is wrong with the file as it stands; what is shown is the last that could be read."""
        self._wrong.setVisible(bool(faults))
        lines = [
            f"line {one.where.line}: {one.found}" + (f"; expected {one.expected}" if one.expected else "") + _hint(one)
            for one in faults[:MOST_FAULTS]
        ]
        if len(faults) > MOST_FAULTS:
            lines.append(f"and {len(faults) - MOST_FAULTS} more")
        self._says.setText("\n".join(["The rig's file cannot be read as it stands; this is how it was before.", *lines]))

    def choose(self, fiber: int) -> None:
        """Choose a fiber's row."""
        if self._fibers is not None and 0 <= fiber < self._fibers.rowCount() and self.table.currentIndex().row() != fiber:
            self.table.selectRow(fiber)

    def set_theme(self, theme: Theme) -> None:
        """Show it in these colours."""
        self.rates.set_theme(theme)

    def changeEvent(self, event: Any) -> None:
        """Other letters want other columns."""
        super().changeEvent(event)
        if event.type() in (event.Type.FontChange, event.Type.StyleChange):
            self._widen()

    def showEvent(self, event: Any) -> None:
        """Only now it is known which letters it has."""
        super().showEvent(event)
        self._widen()

    def _widen(self) -> None:
        """Columns as wide as their first rows and headings."""
        for part in (self.table, self.table.horizontalHeader()):
            part.ensurePolished()
        letters = self.table.horizontalHeader().font()
        letters.setBold(True)  # as the style paints headings
        metrics, bold = self.table.fontMetrics(), QFontMetrics(letters)
        room = metrics.height()
        for column, (word, _) in enumerate(HEADINGS):
            rows = range(min(self._fibers.rowCount(), 64)) if self._fibers is not None else ()
            texts = (self._fibers._text(row, column) for row in rows) if self._fibers is not None else ()
            wide = max(map(metrics.horizontalAdvance, texts), default=0)
            self.table.setColumnWidth(column, max(wide, bold.horizontalAdvance(word)) + room)
        self.table.verticalHeader().setDefaultSectionSize(metrics.height() + 6)

    def _chosen(self, now: QModelIndex, _: QModelIndex) -> None:
        if self._fibers is not None and now.row() >= 0:
            self.rates.show_fiber(self._fibers.rig, self._fibers.abilities, now.row())
            self.fiber_chosen.emit(now.row())


def _hint(one: Fault) -> str:
    return f" ({one.hint})" if one.hint else ""


def _plain(text: str) -> str:
    return text.replace("&", "&amp;").replace("<", "&lt;")
