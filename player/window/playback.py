"""A take played back on the simulator: a run of its own beside the one on the rig, seen in a window of its own."""

import os

import numpy as np
from PySide6.QtCore import QTimer
from PySide6.QtGui import QCloseEvent
from PySide6.QtWidgets import QDialog, QHBoxLayout, QLabel, QPushButton, QVBoxLayout

from player.window.hang_frame import HangFrame
from player.window.link import Link
from player.window.ways import Material

FRAME_MS = 33


class Playback(QDialog):
    """Plays a score on the simulator until its end, or until it is closed. Escape vents the run of the window behind it."""

    def __init__(self, window, path: str):
        super().__init__(window)
        self.setWindowTitle(f"{os.path.basename(path)} - played back on the simulator")
        self.setAccessibleName("a take on the simulator")
        self._window = window
        self.hang = HangFrame()
        self.hang.set_theme(window.theme())
        self.says = QLabel("begins on the simulator …")
        self.says.setAccessibleName("how far it is")
        again = QPushButton("Once more")
        again.setAccessibleName("Once more")
        again.clicked.connect(self.begin)
        close = QPushButton("Close")
        close.setAccessibleName("Close")
        close.clicked.connect(self.close)
        row = QHBoxLayout()
        row.addWidget(self.says, 1)
        row.addWidget(again)
        row.addWidget(close)
        whole = QVBoxLayout(self)
        whole.addWidget(self.hang, 1)
        whole.addLayout(row)
        middle, column = window.parts.middle, window.parts.column
        # Over the picture: VENT and the column stay in view.
        self.resize(max(320, middle.width() - column.width() - 12), middle.height())
        self.move(middle.mapToGlobal(middle.rect().topLeft()))
        self._path = path
        self.link = Link(self)
        self.link.known.connect(self._known)
        self.link.did_not_come.connect(self.says.setText)
        self.link.heard.connect(self._heard)
        self.link.lost.connect(lambda: self.says.setText("the simulation is gone"))
        self._timer = QTimer(self)
        self._timer.timeout.connect(self._frame)
        self._timer.start(FRAME_MS)
        self.ended = False
        self.begin()

    def begin(self) -> None:
        """From the start."""
        self.ended = False
        path, ways = self._path, self._window.ways
        self.link.make(lambda: ways.simulate(path))

    def _known(self, material: Material) -> None:
        if material.rig is not None and material.abilities is not None:
            self.hang.set_rig(material.rig, material.abilities)

    def _heard(self, name: str, fields) -> None:
        if name == "marks":
            self.link.say("arm")
            self.link.say("play", from_s=0.0)
        elif name in ("ended", "failed"):
            self.ended = True
            self.says.setText("\n".join(map(str, fields["lines"][:1])))

    def _frame(self) -> None:
        self.link.look()
        now = self.link.snapshot()
        if now is not None and self.hang.shown is not None:
            self.hang.show_strain(np.nan_to_num(now.array("wanted")), now.array("sensed"))
            if not self.ended:
                self.says.setText(f"on the simulator, bar {now.text('place').partition('.')[0]}")

    def closeEvent(self, event: QCloseEvent) -> None:
        """The simulated run ends too."""
        self._timer.stop()
        self.hang.end()
        self.link.say("stop")
        self.link.leave()
        super().closeEvent(event)
