"""Opening the window, after a list of runs where there is a choice."""

import signal
import sys

from PySide6.QtCore import QTimer
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QApplication

from player.window.choosing import Choosing
from player.window.ways import Ways
from player.window.window import OPENS_AT, RehearseWindow

SIGNALS_MS = 300

TURNS_S = 0.0005
"""How long a thread of Python goes on while another one waits: a key must not wait for the thread that draws the fibers."""


def application() -> QApplication:
    """The one application, made where there is none yet."""
    there = QApplication.instance()
    if isinstance(there, QApplication):
        return there
    QGuiApplication.setApplicationDisplayName("Drawcord")
    made = QApplication(sys.argv[:1])
    made.setApplicationName("drawcord")
    sys.setswitchinterval(TURNS_S)
    return made


def run(ways: Ways, first: str | None) -> int:
    """Rehearse until the window is closed; returns 0. first: the run to attach to, "" to begin one, None to be asked."""
    app = application()
    runs = ways.runs() if first is None else ()
    if not runs and ways.begin is not None:
        first = ""
    if first is None:
        choosing = Choosing(runs, ways.title if ways.begin is not None else "")
        choosing.exec()
        if choosing.chosen is None:
            return 0
        first = choosing.chosen
    window = RehearseWindow(ways, first)
    free = app.primaryScreen().availableGeometry()
    window.resize(*(min(max(least, room * 9 // 10), room) for least, room in
                    zip(OPENS_AT, (free.width(), free.height()), strict=True)))  # fmt: skip
    window.show()
    # A look at Python now and then, so that a signal from outside is heard; it closes, and the run goes by its rule.
    heart = QTimer()
    heart.timeout.connect(lambda: None)
    heart.start(SIGNALS_MS)
    for number in (signal.SIGINT, signal.SIGTERM, getattr(signal, "SIGHUP", signal.SIGTERM)):
        signal.signal(number, lambda *_: window.close())
    app.exec()
    return 0
