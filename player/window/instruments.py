"""Supply, coils, lateness, boards, inputs: a line each, in words, marked where something is wrong."""

from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QGridLayout, QLabel, QSizePolicy, QWidget

from player.engine.process.layout import Snapshot
from player.window.words import boards_said, duty_said, inputs_said, late_said, supply_said

ROWS = {"supply": "supply", "duty": "coils", "late": "ticks", "boards": "boards", "inputs": "inputs"}

HOT = 0.95
"""Share of a coil's burst from which on it is marked."""


class Instruments(QWidget):
    """Shows a moment of a run in words."""

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self.setObjectName("instruments")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        grid = QGridLayout(self)
        grid.setContentsMargins(12, 6, 12, 6)
        grid.setVerticalSpacing(3)
        grid.setColumnStretch(1, 1)
        self.values: dict[str, QLabel] = {}
        for row, (key, word) in enumerate(ROWS.items()):
            name, value = QLabel(word), QLabel("")
            name.setObjectName("name")
            value.setObjectName("value")
            value.setTextFormat(Qt.TextFormat.PlainText)
            value.setAccessibleName(word)
            value.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Preferred)
            grid.addWidget(name, row, 0, Qt.AlignmentFlag.AlignTop)
            grid.addWidget(value, row, 1)
            self.values[key] = value

    def show_now(self, now: Snapshot, about: dict[str, Any], inputs: dict[str, Any], now_s: float, gone: bool = False) -> None:
        """A moment, what the run is, what it has told of its inputs, and the steady clock; gone: that moment was its last."""
        boards, bad = ("not known any more", True) if gone else boards_said(about["boards"], now.texts("link"))
        duty, share = duty_said(now, about["fibers"])
        late, seen = late_said(now)
        self._put("supply", supply_said(now, about["boards"]), 0.0 <= now.number("air_left") < 0.1)
        self._put("duty", duty, share >= HOT)
        self._put("late", late, seen)
        self._put("boards", boards, bad)
        silent = any(one[4] for one in inputs.get("seen", ()))
        self._put("inputs", inputs_said(inputs, now_s, about["kind"] == "live"), silent)

    def _put(self, key: str, text: str, bad: bool) -> None:
        label = self.values[key]
        if label.property("bad") != bad:
            label.setProperty("bad", bad)
            label.style().unpolish(label)
            label.style().polish(label)
        # What is wrong is said in a mark too, not by colour alone.
        text = f"! {text}" if bad else text
        if label.text() != text:
            label.setText(text)
            label.setToolTip(text)
