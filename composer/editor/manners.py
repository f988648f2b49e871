"""How the window looks and what it remembers of that: theme, letters, sizes, its title."""

from typing import Any

from PySide6.QtCore import QByteArray, QSize, Qt
from PySide6.QtGui import QResizeEvent
from PySide6.QtWidgets import QApplication

from composer.editor import dressing
from composer.picture.palette import THEMES

LETTERS_MS = 150
"""How long the size must have stood still before letters follow it."""


class Manners:
    """Looks, and the settings that keep them."""

    # ---- looks ----------------------------------------------------------------------------------------------------------

    def _say_saved(self) -> None:
        modified = self.session.modified
        self.setWindowTitle(f"{self.session.name}{' (not saved)' if modified else ''} - Drawcord")
        unnamed = self.session.path is None
        kept = "not saved; kept" if self.session.keeper.keeps else "neither saved nor kept"
        self.foot.say("saved", kept if modified else "no name yet" if unnamed else "saved")

    def _letters_wanted(self, way: int) -> None:
        self._text_scale = min(max(self._text_scale * 1.1**way, 0.5), 4.0)
        self._letters.start(10)

    def _fit_letters(self, anew: bool = False) -> None:
        scale = min(max(dressing.scale_for(self.width(), self.height()) * self._own_scale, dressing.SMALLEST), dressing.LARGEST)
        if anew or (scale, self._text_scale) != self._scale:
            self._scale = (scale, self._text_scale)
            dressing.dress(QApplication.instance(), self._theme, scale, self._text_scale)

    def set_theme(self, name: str) -> None:
        """Everything in the colours of a theme."""
        self._theme = THEMES[name]
        self._fit_letters(anew=True)
        self.pane.looks.set_theme(self._theme)
        self.showing.set_theme(self._theme)

    @property
    def theme_name(self) -> str:
        """The theme in use."""
        return self._theme.name

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Letters grow with the window."""
        super().resizeEvent(event)
        if not self._scale:
            self._fit_letters()
        else:
            self._letters.start(LETTERS_MS)

    def _remember(self) -> None:
        """As it was when it was last closed."""
        settings = self.settings
        size = settings.value("size")
        if isinstance(size, QSize) and size.isValid():
            self.resize(size.expandedTo(QSize(640, 400)))
        if settings.value("largest") in (True, "true"):
            self.setWindowState(Qt.WindowState.WindowMaximized)
        for name, split in self.splits.items():
            state = settings.value(f"split/{name}")
            if isinstance(state, QByteArray):
                split.restoreState(state)
        self._own_scale = _number(settings.value("letters"), 1.0)
        self._text_scale = _number(settings.value("text letters"), 1.0)
        dark = QApplication.styleHints().colorScheme() != Qt.ColorScheme.Light
        name = str(settings.value("theme") or ("dark" if dark else "light"))
        self.set_theme(name if name in THEMES else "dark")

    def _keep_settings(self) -> None:
        self.settings.setValue("size", self.normalGeometry().size() if self.isMaximized() else self.size())
        self.settings.setValue("largest", self.isMaximized())
        for name, split in self.splits.items():
            self.settings.setValue(f"split/{name}", split.saveState())
        self.settings.setValue("letters", self._own_scale)
        self.settings.setValue("text letters", self._text_scale)
        self.settings.sync()


def _number(value: Any, otherwise: float) -> float:
    try:
        found = float(value)
    except (TypeError, ValueError):
        return otherwise
    return found if 0.25 <= found <= 4.0 else otherwise
