"""Takes of this session: recorded, listed, played back on the simulator, sent to compose as a section of the score."""

import os
from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QHBoxLayout, QLabel, QListWidget, QPushButton, QVBoxLayout, QWidget

from composer.picture.preview.beside import Beside
from player.window import disk
from player.window.actions import NO_HANDS, NO_TAKES
from player.window.playback import Playback
from player.window.takes_work import NotWritten, Written, make
from player.window.ways import Material


class TakesView(QWidget):
    """The panel of takes. `window`: its `tell`, `do`, `ways`."""

    def __init__(self, window):
        super().__init__()
        self._window = window
        self._about: dict[str, Any] = {}
        self._material = Material()
        self._does = ""
        self._folder = ""
        self.playback: Playback | None = None
        self._beside = Beside(self)
        self._beside.said.connect(self._made)
        self._beside.done.connect(self._done)
        self.list = QListWidget()
        self.list.setAccessibleName("takes of this session")
        self.list.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self.list.currentRowChanged.connect(lambda _: self._stand())
        self.says = QLabel()
        self.says.setWordWrap(True)
        self.says.setObjectName("value")
        self.says.setTextFormat(Qt.TextFormat.PlainText)
        self.says.setAccessibleName("about takes")
        self.back = self._button("Play back on the simulator", "as a run of its own; the rig's is not touched", self.play_back)
        self.send = self._button("Send to compose", "as a section of the score, in a file of its own", self.to_compose)
        row = QHBoxLayout()
        row.addWidget(self.back)
        row.addWidget(self.send)
        whole = QVBoxLayout(self)
        whole.setContentsMargins(0, 0, 0, 0)
        whole.addWidget(self.list, 1)
        whole.addWidget(self.says)
        whole.addLayout(row)
        self._stand()

    def _button(self, word: str, says: str, does) -> QPushButton:
        button = QPushButton(word)
        button.setAccessibleName(word)
        button.setAccessibleDescription(says)
        button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        button.clicked.connect(does)
        return button

    def set_run(self, about: dict[str, Any], material: Material) -> None:
        """Another run."""
        self._about, self._material = about, material
        self.renew()

    def heard(self, take: str) -> None:
        """What the run says of its take."""
        self.renew()
        if not self._does:
            self.says.setText(take)

    def ended(self) -> None:
        """The run is over: its last take is whole."""
        self.renew()

    @property
    def paths(self) -> list[str]:
        """The takes that are listed."""
        return [self.list.item(row).data(Qt.ItemDataRole.UserRole) for row in range(self.list.count())]

    def renew(self) -> None:
        """Look which takes there are."""
        rows = []
        if self._material.take_path:
            rows = disk.takes_since(self._material.take_path, self._about.get("began", ""))
        if [row.path for row in rows] != self.paths:
            chosen = self.list.currentRow()
            self.list.clear()
            for row in rows:
                self.list.addItem(os.path.basename(row.path))
                self.list.item(self.list.count() - 1).setData(Qt.ItemDataRole.UserRole, row.path)
            self.list.setCurrentRow(chosen if 0 <= chosen < len(rows) - 1 else len(rows) - 1)
        self._stand()

    def _stand(self) -> None:
        why = "no take is chosen"
        if not self.paths and self._about:
            why = NO_HANDS if self._about.get("kind") != "live" else "no take yet" if self._material.take_path else NO_TAKES
        if self._does:
            why = f"{self._does} …"
        here = self.list.currentRow() >= 0 and not self._does
        for button in (self.back, self.send):
            button.setEnabled(here)
            button.setToolTip(button.accessibleDescription() if here else why)
        if not here:
            self.says.setText(why)

    def _chosen(self) -> str:
        item = self.list.currentItem()
        return item.data(Qt.ItemDataRole.UserRole) if item is not None else ""

    def play_back(self) -> None:
        """The chosen take on the simulator."""
        take = self._chosen()
        if take and not self._does:
            self._folder = self._folder or disk.scratch()
            stem = os.path.splitext(os.path.basename(take))[0]
            self._begin("made ready to be played back", take, disk.free_name(os.path.join(self._folder, stem)), None)

    def to_compose(self) -> None:
        """The chosen take as a section of the score; a score of its own where only a rig was played."""
        take, score = self._chosen(), self._material.score_path
        if take and not self._does:
            stem = os.path.splitext(take)[0]
            if score:
                folder, name = os.path.split(os.path.abspath(score))
                stem = os.path.join(folder, f"{os.path.splitext(name)[0]}-with-{os.path.basename(stem)}")
            else:
                stem += "-composed"
            self._begin("made into a score", take, disk.free_name(stem), score or None)

    def _begin(self, does: str, take: str, out: str, onto: str | None) -> None:
        self._does = f"{os.path.basename(take)} is {does}"
        self._stand()
        self._beside.start(make, take, out, onto)

    def _made(self, message: object) -> None:
        does, self._does = self._does, ""
        self._stand()
        if isinstance(message, NotWritten):
            self._say(message.why)
        elif isinstance(message, Written) and "played back" in does:
            self.says.setText(message.says.partition(": ")[2])
            self.playback = Playback(self._window, message.path)
            self.playback.show()
        elif isinstance(message, Written):
            why = self._window.ways.compose(message.path)
            self._say(message.says + (f". {why}" if why else ""))

    def _done(self, good: bool) -> None:
        if self._does:
            self._does = ""
            self._stand()
            if not good:
                self._say("making the score ended before its time; the take is still there, 'drawcord take' makes one of it")

    def _say(self, text: str) -> None:
        self.says.setText(text)
        self._window.tell((text,))

    def stop(self) -> None:
        """The window closes."""
        self._beside.stop()
        if self.playback is not None:
            self.playback.close()
        if self._folder:
            disk.away(self._folder)
            self._folder = ""
