"""The room of the hang view: empty until it is known which rig a run plays."""

from typing import Any

from PySide6.QtCore import Qt, Signal
from PySide6.QtWidgets import QVBoxLayout, QWidget

from composer.limits.abilities import Abilities
from composer.picture.hang import HangView
from composer.picture.palette import DARK, Theme
from composer.rig.model import Rig


class HangFrame(QWidget):
    """A hang view, once there is a rig; takes no keys, which are all the window's."""

    fiber_clicked = Signal(int)

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self._theme: Theme = DARK
        self._room = QVBoxLayout(self)
        self._room.setContentsMargins(0, 0, 0, 0)
        self.shown: HangView | None = None

    @property
    def view(self) -> str:
        """From where it is seen."""
        return self.shown.view if self.shown is not None else "front"

    def set_rig(self, rig: Rig, abilities: Abilities) -> None:
        """Draw a rig."""
        if self.shown is None:
            self.shown = HangView(rig, abilities)
            self.shown.setFocusPolicy(Qt.FocusPolicy.NoFocus)
            self.shown.set_theme(self._theme)
            self.shown.fiber_clicked.connect(self.fiber_clicked)
            self._room.addWidget(self.shown)
        else:
            self.shown.set_rig(rig, abilities)

    def show_strain(self, wanted: Any, sensed: Any = None) -> None:
        """Move the fibers."""
        if self.shown is not None:
            self.shown.show_strain(wanted, sensed)

    def set_view(self, view: str) -> None:
        """See it from elsewhere."""
        if self.shown is not None:
            self.shown.set_view(view)

    def set_theme(self, theme: Theme) -> None:
        """Draw in these colours."""
        self._theme = theme
        if self.shown is not None:
            self.shown.set_theme(theme)
