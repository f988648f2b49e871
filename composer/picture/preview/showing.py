"""The preview window: the hang view over the cloth, a transport, written or retimed, as wanted or as the rig would move."""

import sys
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QSize, Qt
from PySide6.QtGui import QCloseEvent, QKeyEvent, QResizeEvent
from PySide6.QtWidgets import (
    QApplication,
    QButtonGroup,
    QHBoxLayout,
    QLabel,
    QProgressBar,
    QPushButton,
    QSplitter,
    QVBoxLayout,
    QWidget,
)

from composer.motion import Cursor
from composer.picture import palette
from composer.picture.bands import bands_of
from composer.picture.chrome import scale_of, style_of
from composer.picture.cloth.cloth_view import ClothView
from composer.picture.cloth.weave import Weave
from composer.picture.hang.camera import VIEWS
from composer.picture.hang.hang_view import HangView
from composer.picture.material import Piece
from composer.picture.preview.beside import Beside
from composer.picture.preview.transport import Transport
from composer.picture.preview.work import Failed, Mended, Progress, Ran, Snags, mend, simulate, strain_at_head
from composer.warp import along

Array = NDArray[np.float64]

OPENS_AT = (1280, 800)
"""Pixels of the window on a screen that has no more to give; on a larger one it takes four fifths."""

KEYS = "Space play   I O L loop   , . speed   C counts   F S T view   R retimed   M simulated   D dark/light   Esc close"


@dataclass(slots=True)
class Way:
    """One way that a piece is timed, and what is known of it so far."""

    piece: Piece
    cursor: Cursor
    snags: tuple = ()
    ran: Ran | None = None


class SeenCloth(ClothView):
    """A cloth to look at: nothing in it can be taken hold of but the play head."""

    def _hit_near(self, view, at) -> int:
        return -1


class Showing(QWidget):
    """Shows a piece. `path` and `rig_path`: where it came from, for retiming; None where it is not a score."""

    def __init__(self, piece: Piece, path: str | None = None, rig_path: str | None = None):
        super().__init__()
        self._path, self._rig_path = path, rig_path
        self._ways: dict[str, Way] = {}
        self._now = "retimed" if piece.retimed else "written"
        self._ways[self._now] = Way(piece, Cursor(piece.tracks, piece.abilities))
        self._warp: tuple[Array, Array] | None = None
        self._simulated = True
        self._working: str | None = None
        self._beside = Beside(self)
        self._beside.said.connect(self._hear)
        self._beside.done.connect(self._worked)
        self._theme = palette.DARK
        self._hang = HangView(piece.rig, piece.abilities)
        self._cloth = SeenCloth()
        self._transport = Transport()
        self._build(piece)
        self._transport.moved.connect(self._move)
        self._cloth.head_moved.connect(self._transport.move_to)
        self._cloth.thread_clicked.connect(self._clicked)
        self._hang.fiber_clicked.connect(self._choose)
        self._show_way()
        self._wear()
        self._cloth.setFocus()
        self._work()

    def _build(self, piece: Piece) -> None:
        self.setWindowTitle(f"{piece.title} - preview")
        self.setMinimumSize(760, 520)
        self._title = QLabel(piece.title)
        self._title.setObjectName("title")
        self._choices = {
            "written": self._choice("As written", "the score's own times (R)", lambda: self.show_timing("written")),
            "retimed": self._choice("Retimed", "the least change that the rig can do (R)", lambda: self.show_timing("retimed")),
            "simulated": self._choice("Simulated", "as the rig would really move (M)", lambda: self.show_simulated(True)),
            "wanted": self._choice("As wanted", "as the score asks (M)", lambda: self.show_simulated(False)),
        }
        groups = (QButtonGroup(self), QButtonGroup(self))
        for number, button in enumerate(self._choices.values()):
            groups[number // 2].addButton(button)
        self._choices[self._now].setChecked(True)
        self._choices["simulated"].setChecked(True)
        if self._path is None:
            other = self._choices["written" if self._now == "retimed" else "retimed"]
            other.setEnabled(False)
            other.setToolTip("a play file holds no other times" if piece.retimed else "only a score can be retimed")
        self._light = QPushButton("Light")
        self._light.setToolTip("dark or light (D)")
        self._light.setAccessibleName("dark or light")
        self._light.clicked.connect(self.change_theme)
        self._state = QLabel()
        self._state.setAccessibleName("what is being worked out")
        self._bar = QProgressBar()
        self._bar.setRange(0, 1000)
        self._bar.setTextVisible(False)
        self._bar.setFixedSize(120, 8)
        self._bar.setAccessibleName("how much is worked out")
        head = QHBoxLayout()
        head.setContentsMargins(10, 6, 10, 2)
        head.addWidget(self._title)
        head.addSpacing(16)
        for name, button in self._choices.items():
            head.addWidget(button)
            if name == "retimed":
                head.addSpacing(16)
        head.addStretch(1)
        head.addWidget(self._state)
        head.addWidget(self._bar)
        head.addWidget(self._light)
        split = QSplitter(Qt.Orientation.Vertical)
        split.addWidget(self._hang)
        split.addWidget(self._cloth)
        split.setSizes([430, 300])
        split.setChildrenCollapsible(False)
        self._told = QLabel()
        self._told.setWordWrap(True)
        self._told.setAccessibleName("what the simulated run told")
        self._told.setContentsMargins(10, 0, 10, 0)
        keys = QLabel(KEYS)
        keys.setObjectName("keys")
        keys.setContentsMargins(10, 0, 10, 6)
        whole = QVBoxLayout(self)
        whole.setContentsMargins(0, 0, 0, 0)
        whole.setSpacing(2)
        whole.addLayout(head)
        whole.addWidget(split, 1)
        whole.addWidget(self._told)
        whole.addWidget(self._transport)
        whole.addWidget(keys)

    def _choice(self, word: str, says: str, does) -> QPushButton:
        button = QPushButton(word)
        button.setCheckable(True)
        button.setAccessibleName(word)
        button.setToolTip(says)
        button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        button.clicked.connect(does)
        return button

    def sizeHint(self) -> QSize:
        """The size to open with."""
        return QSize(*OPENS_AT)

    @property
    def transport(self) -> Transport:
        """What plays it."""
        return self._transport

    @property
    def hang(self) -> HangView:
        """The fibers where they hang."""
        return self._hang

    @property
    def timing(self) -> str:
        """The times shown: written or retimed."""
        return self._now

    @property
    def simulated(self) -> bool:
        """Whether fibers are shown as the rig would move them, once that is known."""
        return self._simulated

    def ran(self, timing: str) -> Ran | None:
        """The simulated run with these times, None before it is known."""
        way = self._ways.get(timing)
        return None if way is None else way.ran

    def show_timing(self, timing: str) -> None:
        """Show the times as written or as retimed, at the same place in the music; what is not known is worked out first."""
        if timing == self._now or not self._choices[timing].isEnabled():
            return
        if timing in self._ways:
            at = self._transport.head_s
            if self._warp is not None:
                here, there = self._warp if timing == "retimed" else self._warp[::-1]
                at = float(along(at, here, there))
            self._now = timing
            self._choices[timing].setChecked(True)
            self._show_way()
            self._transport.move_to(at)
        self._work(retiming=timing == "retimed" and timing not in self._ways)

    def show_simulated(self, simulated: bool) -> None:
        """Show fibers as the rig would move them, what is wanted as a ghost; or as wanted alone."""
        self._simulated = simulated
        self._choices["simulated" if simulated else "wanted"].setChecked(True)
        self._show_way()

    def change_theme(self) -> None:
        """From dark to light, or back."""
        self._theme = palette.LIGHT if self._theme is palette.DARK else palette.DARK
        self._wear()

    def _wear(self) -> None:
        self._scale = scale_of(self.width(), self.height())
        self.setStyleSheet(style_of(self._theme, self._scale))
        self._light.setText("Light" if self._theme is palette.DARK else "Dark")
        self._hang.set_theme(self._theme)
        self._cloth.set_theme(self._theme)

    def _show_way(self) -> None:
        way = self._ways[self._now]
        piece, ran = way.piece, way.ran
        seen = self._simulated and ran is not None
        self._cloth.set_weave(
            Weave(
                tracks=ran.tracks if seen else piece.tracks,
                abilities=piece.abilities,
                bands=bands_of(piece.rig),
                names=piece.names,
                tempo=piece.tempo,
                snags=way.snags,
                pins_s=piece.pins_s,
                cues=piece.cues,
                lanes=ran.lanes if ran is not None else (),
            )
        )
        self._transport.set_piece(piece.tempo, piece.tracks.duration_s)
        self._told.setText("  ".join(ran.told) if ran is not None else "")

    def _move(self, at_s: float) -> None:
        way = self._ways[self._now]
        wanted = way.cursor.at(at_s)[0]
        sensed = strain_at_head(way.ran, at_s) if self._simulated and way.ran is not None else None
        self._hang.show_strain(wanted, sensed)
        if self._cloth.head_s != at_s:
            self._cloth.set_head(at_s, follow=self._transport.playing)

    def _clicked(self, fiber: int, at_s: float) -> None:
        self._choose(fiber)
        self._transport.move_to(at_s)

    def _choose(self, fiber: int) -> None:
        self._hang.light({fiber})
        self._cloth.choose_fiber(fiber)

    def _work(self, retiming: bool = False) -> None:
        """Have worked out what is missing: the retiming where it is asked for, else the run of what is shown."""
        way = self._ways[self._now]
        if retiming:
            self._working = "retiming"
            self._tell_state("retiming", 0.0)
            self._beside.start(mend, self._ways["written"].piece, self._path, self._rig_path)
        elif way.ran is None:
            self._working = self._now
            self._tell_state("simulating", 0.0)
            self._beside.start(simulate, way.piece)

    def _tell_state(self, what: str, share: float | None) -> None:
        self._bar.setVisible(share is not None)
        self._bar.setRange(0, 1000 if share else 0)
        if share:
            self._bar.setValue(round(1000 * share))
        self._state.setText(what)

    def _hear(self, message: object) -> None:
        if isinstance(message, Progress):
            self._tell_state(message.what, message.share)
        elif isinstance(message, Failed):
            self._tell_state(f"{message.what}: {message.why}", None)
            self._choices[self._now].setChecked(True)
        elif isinstance(message, Mended):
            self._warp = (message.was_s, message.now_s)
            self._ways["retimed"] = Way(message.piece, Cursor(message.piece.tracks, message.piece.abilities))
        elif isinstance(message, Snags) and self._working in self._ways:
            self._ways[self._working].snags = message.snags
            self._renew()
        elif isinstance(message, Ran) and self._working in self._ways:
            self._ways[self._working].ran = message
            self._tell_state("", None)
            self._renew()

    def _renew(self) -> None:
        if self._working == self._now:
            self._show_way()
            self._move(self._transport.head_s)

    def _worked(self, good: bool) -> None:
        was, self._working = self._working, None
        if not good:
            self._tell_state(f"{was or 'the work'} ended before its time; close and open again", None)
            self._choices[self._now].setChecked(True)
        elif was == "retiming" and "retimed" in self._ways:
            self.show_timing("retimed")
        elif self._ways[self._now].ran is None and was != "retiming":
            self._work()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Everything by key, wherever the focus is."""
        view = next((each.name for each in VIEWS.values() if event.text().upper() == each.key), None)
        if self._transport.key(event):
            return
        if view is not None:
            self._hang.set_view(view)
        elif event.key() == Qt.Key.Key_R:
            self.show_timing("written" if self._now == "retimed" else "retimed")
        elif event.key() == Qt.Key.Key_M:
            self.show_simulated(not self._simulated)
        elif event.key() == Qt.Key.Key_D:
            self.change_theme()
        elif event.key() == Qt.Key.Key_Escape:
            self.close()
        else:
            super().keyPressEvent(event)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Words grow with the window."""
        if scale_of(self.width(), self.height()) != self._scale:
            self._wear()

    def closeEvent(self, event: QCloseEvent) -> None:
        """Nothing goes on behind a closed window."""
        self._transport.pause()
        self._beside.stop()
        super().closeEvent(event)


def show(piece: Piece, path: str | None = None, rig_path: str | None = None) -> int:
    """Show a piece in a window until it is closed; returns 0."""
    application = QApplication.instance() or QApplication(sys.argv[:1])
    window = Showing(piece, path, rig_path)
    # Left to itself, Qt would open it at two thirds of the screen at most.
    free = application.primaryScreen().availableGeometry()
    window.resize(
        *(max(min(size, room), room * 4 // 5) for size, room in zip(OPENS_AT, (free.width(), free.height()), strict=True))
    )
    window.show()
    application.exec()
    return 0
