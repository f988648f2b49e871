"""Starting the compose window: the workers first, so that they load while the window comes up."""

import gc
import os
import signal
import sys

from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QApplication

from composer.editor.crew import Crew

SIGNALS_MS = 300


def application() -> QApplication:
    """The one application, made where there is none yet."""
    there = QApplication.instance()
    if isinstance(there, QApplication):
        return there
    QGuiApplication.setApplicationDisplayName("Drawcord")
    made = QApplication(sys.argv[:1])
    made.setApplicationName("drawcord")
    return made


def open_window(path: str | None) -> "object":
    """The window with a score, or with *Estuary* as an unsaved copy, shown. Needs an application."""
    crew = Crew()
    crew.warm()
    from composer.editor.window import ComposeWindow

    window = ComposeWindow(crew)
    # What is there once the first picture is up stays as long as the window: no later look for garbage goes through it again.
    window.showing.redrawn.connect(lambda: gc.freeze(), Qt.ConnectionType.SingleShotConnection)
    if path is not None and not os.path.lexists(path):
        window.session.begin_at(path)
    elif path is None or not window.session.open(path):
        window.session.open_demo()
        if path is None:
            window.do_first_help()
    window.pane.setFocus()
    window.show()
    return window


def run(path: str | None) -> int:
    """Compose until the window is closed; returns 0."""
    app = application()
    window = open_window(path)
    # A look at Python now and then, so that a signal from outside is heard; it closes, keeping what is not saved.
    heart = QTimer()
    heart.timeout.connect(lambda: None)
    heart.start(SIGNALS_MS)

    def end(*_: object) -> None:
        window._closing = True
        window.close()

    for number in (signal.SIGINT, signal.SIGTERM, getattr(signal, "SIGHUP", signal.SIGTERM)):
        signal.signal(number, end)
    app.exec()
    return 0
