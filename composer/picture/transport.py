"""The transport: play, pause, scrub, loop a passage, speed; where the head is, as bar and count and in seconds."""

from PySide6.QtCore import QElapsedTimer, Qt, QTimer, Signal
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QLabel, QPushButton, QSlider, QWidget

from composer.picture import play_head
from composer.picture.axes import say_seconds
from composer.picture.bars import Bars
from composer.picture.play_head import PlayHead

FRAME_MS = 16
STEPS = 10_000
"""Positions of the slider that scrubs."""

SPEEDS = (0.25, 0.5, 0.75, 1.0, 1.25, 1.5, 2.0)


class Transport(QWidget):
    """Plays a piece of some seconds: `moved` says where the head is, as often as a frame is drawn."""

    moved = Signal(float)
    """Where the head is, in s, whenever it moves."""
    playing_changed = Signal(bool)
    """Whether the head runs."""
    loop_changed = Signal(object)
    """The passage that is looped, (from, to) in s, or None."""

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self._head = PlayHead(1e-3)
        self._bars: Bars | None = None
        self._mark_s: float | None = None
        self._clock = QElapsedTimer()
        self._timer = QTimer(self)
        self._timer.setTimerType(Qt.TimerType.PreciseTimer)
        self._timer.setInterval(FRAME_MS)
        self._timer.timeout.connect(self._run)
        self.setAccessibleName("transport")
        row = QHBoxLayout(self)
        row.setContentsMargins(8, 4, 8, 4)
        self._start = self._button("To start", "back to the start (Home)", self.to_start)
        self._play = self._button("Play", "play or pause (Space)", self.toggle)
        self._scrub = QSlider(Qt.Orientation.Horizontal)
        self._scrub.setRange(0, STEPS)
        self._scrub.setAccessibleName("place in the piece")
        self._scrub.valueChanged.connect(self._scrubbed)
        self._where = QLabel()
        self._where.setAccessibleName("where the play head is")
        self._from = self._button("Loop from", "the passage begins here (I)", self.mark_loop_start)
        self._to = self._button("Loop to", "the passage ends here (O)", self.mark_loop_end)
        self._loop = self._button("No loop", "play on to the end (L)", self.clear_loop)
        self._speed = QComboBox()
        self._speed.setAccessibleName("speed")
        self._speed.setToolTip("speed (less: comma, more: full stop)")
        for speed in SPEEDS:
            self._speed.addItem(f"{speed:g} × speed", speed)
        self._speed.setCurrentIndex(SPEEDS.index(1.0))
        self._speed.currentIndexChanged.connect(lambda at: self.set_speed(SPEEDS[at]))
        for each in (self._start, self._play, self._where, self._scrub, self._from, self._to, self._loop, self._speed):
            row.addWidget(each, 1 if each is self._scrub else 0)
        self._show()

    def _button(self, word: str, says: str, does) -> QPushButton:
        button = QPushButton(word)
        button.setAccessibleName(word)
        button.setToolTip(says)
        button.clicked.connect(does)
        return button

    def set_piece(self, bars: Bars, duration_s: float) -> None:
        """Play a piece of other bars or length; the head stays where it is, as far as the piece goes."""
        self._bars = bars
        head = self._head
        self._head = PlayHead(max(duration_s, 1e-3), 0.0, head.playing, head.speed)
        if head.loop_s is not None:
            self._head = play_head.with_loop(self._head, *head.loop_s)
        self.move_to(head.at_s)

    @property
    def head_s(self) -> float:
        """Where the head is, in s."""
        return self._head.at_s

    @property
    def head(self) -> PlayHead:
        """The head as it is."""
        return self._head

    @property
    def playing(self) -> bool:
        """Whether the head runs."""
        return self._head.playing

    def move_to(self, at_s: float) -> None:
        """Put the head at an instant."""
        self._head = play_head.moved_to(self._head, at_s)
        self._show()
        self.moved.emit(self._head.at_s)

    def to_start(self) -> None:
        """Put the head at the start."""
        self.move_to(0.0)

    def play(self) -> None:
        """Run from where the head is; from the start where it is at the end."""
        if not self.playing:
            self._head = play_head.started(self._head)
            self._clock.start()
            self._timer.start()
            self._show()
            self.playing_changed.emit(True)

    def pause(self) -> None:
        """Stand still."""
        if self.playing:
            self._head = play_head.stopped(self._head)
            self._timer.stop()
            self._show()
            self.playing_changed.emit(False)

    def toggle(self) -> None:
        """Play, or pause."""
        if self.playing:
            self.pause()
        else:
            self.play()

    def set_speed(self, speed: float) -> None:
        """Run at 0.25 to 2 times the piece's pace."""
        self._head = play_head.with_speed(self._head, speed)
        nearest = min(range(len(SPEEDS)), key=lambda at: abs(SPEEDS[at] - self._head.speed))
        self._speed.blockSignals(True)
        self._speed.setCurrentIndex(nearest)
        self._speed.blockSignals(False)

    def step_speed(self, way: int) -> None:
        """The next speed up (1) or down (-1)."""
        at = min(max(self._speed.currentIndex() + way, 0), len(SPEEDS) - 1)
        self.set_speed(SPEEDS[at])

    def set_loop(self, from_s: float, to_s: float) -> None:
        """Go round in a passage."""
        self._mark_s = None
        self._head = play_head.with_loop(self._head, from_s, to_s)
        self._show()
        self.loop_changed.emit(self._head.loop_s)

    def mark_loop_start(self) -> None:
        """Let the passage begin where the head is; it ends where it ended, or at a mark still to come."""
        loop = self._head.loop_s
        if loop is not None and self.head_s < loop[1]:
            self.set_loop(self.head_s, loop[1])
        else:
            self.clear_loop()
            self._mark_s = self.head_s
            self._show()

    def mark_loop_end(self) -> None:
        """Let the passage end where the head is; it begins at the mark, where it began, or at the start."""
        loop = self._head.loop_s
        begin = self._mark_s if self._mark_s is not None else loop[0] if loop is not None else 0.0
        self.set_loop(begin, self.head_s)

    def clear_loop(self) -> None:
        """Play on to the end."""
        self._mark_s = None
        self._head = play_head.without_loop(self._head)
        self._show()
        self.loop_changed.emit(None)

    def _run(self) -> None:
        self._head = play_head.advanced(self._head, self._clock.nsecsElapsed() / 1e9)
        self._clock.restart()
        self._show()
        self.moved.emit(self._head.at_s)
        if not self._head.playing:
            self._timer.stop()
            self._show()
            self.playing_changed.emit(False)

    def _scrubbed(self, position: int) -> None:
        self.move_to(position / STEPS * self._head.end_s)

    def _show(self) -> None:
        head = self._head
        self._scrub.blockSignals(True)
        self._scrub.setValue(round(head.at_s / head.end_s * STEPS))
        self._scrub.blockSignals(False)
        word = "Pause" if head.playing else "Play"
        if self._play.text() != word:
            self._play.setText(word)
            self._play.setAccessibleName(word)
        place = self._bars.say_place(head.at_s) if self._bars is not None else ""
        self._where.setText(f"{place}    {say_seconds(head.at_s, 1)}")
        self._loop.setEnabled(head.loop_s is not None or self._mark_s is not None)
