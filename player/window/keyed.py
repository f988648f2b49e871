"""The window's keys: those of the table, from wherever the focus is, but not where somebody writes."""

from PySide6.QtCore import QEvent, QObject, Qt, QTimer
from PySide6.QtGui import QKeyEvent, QKeySequence
from PySide6.QtWidgets import QAbstractButton, QAbstractSpinBox, QApplication, QLineEdit, QWidget

from player.window.actions import ACTIONS, BY_KEY, why_not_now
from player.window.hold_button import HoldButton
from player.window.meters_view import MetersView
from player.window.parted import Parted

WRITTEN_IN = (QLineEdit, QAbstractSpinBox)

REPEATS_MS = 100
"""A key that is held comes up and down many times a second on some systems: it is up once it has been for so long."""


class Keyed(Parted):
    """Hands keys on to `do`, `hold` and the button that is held to arm."""

    _letting_go: QTimer
    _lets_go: str = ""

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Keys of the table from wherever the focus is in this window, but not where somebody writes."""
        kind = event.type()
        if kind in (QEvent.Type.ApplicationDeactivate, QEvent.Type.WindowDeactivate) and watched in (
            self, QApplication.instance(),
        ):  # fmt: skip
            self._let_go_of_keys()
            return False
        if kind not in (QEvent.Type.KeyPress, QEvent.Type.KeyRelease) or not self._is_ours(watched):
            return False
        return self._key(event, kind == QEvent.Type.KeyPress)

    def _is_ours(self, watched: QObject) -> bool:
        if isinstance(watched, QWidget):
            return watched.window() is self
        return watched is self.windowHandle() and QApplication.activeWindow() in (self, None)

    def _key(self, event: QKeyEvent, down: bool) -> bool:
        focus = QApplication.focusWidget()
        if isinstance(focus, WRITTEN_IN) or QApplication.activePopupWidget() is not None:
            return False
        row = BY_KEY.get(name_of(event))
        if row is None or (row.name == "vent" and event.key() == Qt.Key.Key_Escape):
            return False
        if row.name == "go_on" and isinstance(focus, QAbstractButton | MetersView):
            # Enter presses the button, or takes the row, that somebody has gone to by Tab.
            if isinstance(focus, MetersView | HoldButton):
                return False
            if down and not event.isAutoRepeat():
                focus.click()
            return True
        if event.isAutoRepeat():
            return True
        if row.held:
            self._held_key(row.name, down)
        elif down:
            self.do(row.name)
        return True

    def _held_key(self, name: str, down: bool) -> None:
        if down:
            if self._letting_go.isActive() and self._lets_go == name:
                # It repeats itself, and its system has not said so.
                self._letting_go.stop()
                return
            if name == "hold":
                self.hold(True)
                return
            if why := why_not_now("arm", self._standing):
                self.parts.why.setText(f"{ACTIONS['arm'].word}: {why}")
            self.parts.arm.begin()
        else:
            self._lets_go = name
            self._letting_go.start(REPEATS_MS)

    def _let_go(self) -> None:
        """The key that was held is really up."""
        if self._lets_go == "hold":
            self.hold(False)
        else:
            self.parts.arm.end()

    def _let_go_of_keys(self) -> None:
        self._letting_go.stop()
        self.parts.arm.end()
        self.hold(False)

    def hold(self, down: bool) -> None:
        """Hold-to-run goes down, and is said anew as long as it is, or up."""
        if down == self._held or (down and why_not_now("hold", self._standing)):
            return
        self._held = down
        self.link.say("hold", down=down)
        if down:
            self._holding.start()
        else:
            self._holding.stop()


def name_of(event: QKeyEvent) -> str:
    """A key as the table of actions writes it; keypad and shift make no other key of it."""
    held = event.modifiers() & ~(Qt.KeyboardModifier.KeypadModifier | Qt.KeyboardModifier.ShiftModifier)
    text = QKeySequence(held.value | event.key()).toString(QKeySequence.SequenceFormat.PortableText)
    return {"Esc": "Escape"}.get(text, text)
