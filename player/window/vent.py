"""VENT by key, from wherever the focus is: dialogs, lists, fields that are written in. Said from within the key's handler."""

from collections.abc import Callable

from PySide6.QtCore import QEvent, QObject, Qt
from PySide6.QtWidgets import QApplication


class VentKey(QObject):
    """Sees every event of the application before anybody else; Escape goes no further than here.

    `wanted`: whether there is something to vent, else Escape does what it does everywhere
    """

    def __init__(self, application: QApplication, vent: Callable[[], None], wanted: Callable[[], bool]):
        super().__init__(application)
        self._vent, self._wanted = vent, wanted
        self._application = application
        application.installEventFilter(self)

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Escape pressed, in whatever window and with whatever else is held down."""
        kind = event.type()
        if kind != QEvent.Type.KeyPress and kind != QEvent.Type.ShortcutOverride:
            return False
        if event.key() != Qt.Key.Key_Escape or not self._wanted():
            return False
        if kind == QEvent.Type.KeyPress:
            if not event.isAutoRepeat():
                self._vent()
            return True
        # A shortcut of somebody else's with Escape in it is not to come first.
        event.accept()
        return True

    def remove(self) -> None:
        """See no events any more."""
        self._application.removeEventFilter(self)
