"""The room of the hang view: empty until it is known which rig a run plays."""

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import Qt, Signal
from PySide6.QtWidgets import QVBoxLayout, QWidget

from composer.limits.abilities import Abilities
from composer.picture.palette import DARK, Theme
from composer.rig.model import Rig
from player.window.hang_beside import HangBeside

Array = NDArray[np.float64]


class HangFrame(QWidget):
    """A hang view, once there is a rig; takes no keys, which are all the window's."""

    fiber_clicked = Signal(int)

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self._theme: Theme = DARK
        self._room = QVBoxLayout(self)
        self._room.setContentsMargins(0, 0, 0, 0)
        self.shown: HangBeside | None = None
        self._strains: tuple[Array, Array] | None = None

    @property
    def view(self) -> str:
        """From where it is seen."""
        return self.shown.view if self.shown is not None else "front"

    def set_rig(self, rig: Rig, abilities: Abilities) -> None:
        """Draw a rig."""
        self._strains = None
        if self.shown is None:
            self.shown = HangBeside(rig, abilities)
            self.shown.setFocusPolicy(Qt.FocusPolicy.NoFocus)
            self.shown.set_theme(self._theme)
            self.shown.fiber_clicked.connect(self.fiber_clicked)
            self._room.addWidget(self.shown)
        else:
            self.shown.set_rig(rig, abilities)

    @property
    def cost_ms(self) -> float:
        """What it last cost to draw."""
        return self.shown.cost_ms if self.shown is not None else 0.0

    def show_strain(self, wanted: Array, sensed: Array) -> None:
        """Move the fibers, strains (F,) wanted and sensed; nothing is drawn anew where none has moved."""
        before, self._strains = self._strains, (wanted, sensed)
        still = before is not None and all(
            np.array_equal(a, b, equal_nan=True) for a, b in zip(before, (wanted, sensed), strict=True)
        )
        if self.shown is not None and not still:
            self.shown.show_strain(wanted, sensed)

    def leave_room(self, above_px: int) -> None:
        """Have so many pixels above the fibers free of them."""
        if self._room.contentsMargins().top() != above_px:
            self._room.setContentsMargins(0, above_px, 0, 0)

    def set_view(self, view: str) -> None:
        """See it from elsewhere."""
        if self.shown is not None:
            self.shown.set_view(view)

    def set_theme(self, theme: Theme) -> None:
        """Draw in these colours."""
        self._theme = theme
        if self.shown is not None:
            self.shown.set_theme(theme)

    def end(self) -> None:
        """The window closes."""
        if self.shown is not None:
            self.shown.end()
