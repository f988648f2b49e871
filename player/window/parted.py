"""What all that makes up the window shares: its parts, its run, what it knows of it."""

from collections.abc import Callable

from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QLabel, QWidget

from player.engine.process.layout import Snapshot
from player.window.actions import Standing
from player.window.building import Parts
from player.window.link import Link
from player.window.ways import Material, Told, Ways

METERS, PREFLIGHT, TAKES, MAP = range(4)


class Parted(QWidget):
    """A window with a link to a run. `now`: the run as last seen; `stage`: as `actions.Standing` has it."""

    ways: Ways
    link: Link
    told: Told
    material: Material
    stage: str
    now: Snapshot | None
    margins: list[str]
    wrong: list[str]
    parts: Parts
    _clock: Callable[[], float]
    _standing: Standing
    _drawn: bool
    _held: bool
    _rested: bool
    _unsent: bool
    _behind: bool
    _vented_s: float | None
    _light: int
    _theme_name: str
    _frames: QTimer

    @property
    def is_gone(self) -> bool:
        """Whether the run's process has gone without a word."""
        return self.stage == "over" and self.told.last is None and self.link.client is not None


def put(label: QLabel, text: str) -> None:
    """Another text, where it is another."""
    if label.text() != text:
        label.setText(text)


def restyle(widget: QWidget) -> None:
    """Look at the style sheet again, as a property has changed."""
    widget.style().unpolish(widget)
    widget.style().polish(widget)


def beside_vent(dialog: QWidget, window: Parted, foot: bool = False) -> None:
    """Put a dialog over the picture, where it covers neither VENT nor the column; `foot`: down to the window's foot."""
    middle, column = window.parts.middle, window.parts.column
    high = window.height() - middle.y() - 12 if foot else middle.height()
    dialog.resize(max(320, middle.width() - column.width() - 12), high)
    dialog.move(middle.mapToGlobal(middle.rect().topLeft()))
