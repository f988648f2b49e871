"""The transport: play, pause, scrub, loop a passage, speed; where the head is, as bar and count and in seconds."""

from PySide6.QtCore import QElapsedTimer, Qt, QTimer, Signal
from PySide6.QtGui import QHideEvent, QKeyEvent
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QLabel, QPushButton, QSizePolicy, QSlider, QWidget

from composer.picture.axes import say_seconds
from composer.picture.bars import Bars
from composer.picture.preview import play_head
from composer.picture.preview.metronome import Metronome
from composer.picture.preview.play_head import PlayHead
from composer.sound.speaker import tool

FRAME_MS = 16
AGAIN_MS = 60
"""How long the head must be left alone before the counts sound again."""

STEPS = 10_000
"""Positions of the slider that scrubs."""

WIDEST = "888:8.888    88:88.8"
"""A place that is as wide as most, so that what stands beside it does not move."""

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
        self._metronome = Metronome()
        self._again = QTimer(self)
        self._again.setSingleShot(True)
        self._again.setInterval(AGAIN_MS)
        self._again.timeout.connect(self._begin_sound)
        self._counts = self._button("Counts", "hear the counts, the first of a bar higher (C)", lambda: None)
        self._counts.setCheckable(True)
        self._counts.toggled.connect(self._sound)
        self._volume = QSlider(Qt.Orientation.Horizontal)
        self._volume.setRange(0, 100)
        self._volume.setValue(round(100 * self._metronome.volume))
        self._volume.setObjectName("volume")
        self._volume.setSizePolicy(QSizePolicy.Policy.Fixed, QSizePolicy.Policy.Fixed)
        self._volume.setAccessibleName("volume of the counts")
        self._volume.setToolTip("volume of the counts")
        self._volume.valueChanged.connect(self._set_volume)
        if tool() is None:
            self._counts.setEnabled(False)
            self._volume.setEnabled(False)
            self._counts.setToolTip("there is no program for sound on this machine: aplay or paplay would do")
        shown = (self._start, self._play, self._where, self._scrub, self._from, self._to, self._loop, self._speed)
        for each in (*shown, self._counts, self._volume):
            row.addWidget(each, 1 if each is self._scrub else 0)
        self._show()

    def _button(self, word: str, says: str, does) -> QPushButton:
        button = QPushButton(word)
        button.setAccessibleName(word)
        button.setToolTip(says)
        button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
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
        self._sound()
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
            self._sound()
            self._show()
            self.playing_changed.emit(True)

    def pause(self) -> None:
        """Stand still."""
        if self.playing:
            self._head = play_head.stopped(self._head)
            self._timer.stop()
            self._sound()
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
        self._sound()

    def step_speed(self, way: int) -> None:
        """The next speed up (1) or down (-1)."""
        at = min(max(self._speed.currentIndex() + way, 0), len(SPEEDS) - 1)
        self.set_speed(SPEEDS[at])

    def set_loop(self, from_s: float, to_s: float) -> None:
        """Go round in a passage."""
        self._mark_s = None
        self._head = play_head.with_loop(self._head, from_s, to_s)
        self._sound()
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
        self._sound()
        self._show()
        self.loop_changed.emit(None)

    @property
    def counts_sound(self) -> bool:
        """Whether the counts are to be heard."""
        return self._counts.isChecked()

    def set_counts_sound(self, on: bool) -> None:
        """Have the counts heard, or not; without audio nothing happens."""
        if self._counts.isEnabled():
            self._counts.setChecked(on)

    def _set_volume(self, percent: int) -> None:
        self._metronome.volume = percent / 100.0

    def _sound(self) -> None:
        """End the sound, and begin it again in a moment where it should be heard: scrubbing begins nothing at each step."""
        self._metronome.stop()
        if self.playing and self.counts_sound:
            self._again.start()

    def _begin_sound(self) -> None:
        if self.playing and self.counts_sound and self._bars is not None:
            self._metronome.start(self._head, self._bars)

    def _run(self) -> None:
        passed = self._clock.nsecsElapsed() / 1e9
        self._clock.restart()
        self._head = play_head.advanced(self._head, passed)
        if self._bars is not None:
            self._metronome.run(passed, self._bars)
        self._show()
        self.moved.emit(self._head.at_s)
        if not self._head.playing:
            self._timer.stop()
            self._metronome.stop()
            self._show()
            self.playing_changed.emit(False)

    def key(self, event: QKeyEvent) -> bool:
        """Do what a key asks for, and say whether it asked for anything; windows hand on the keys that they have no use for."""
        does = {
            Qt.Key.Key_Space: self.toggle,
            Qt.Key.Key_Home: self.to_start,
            Qt.Key.Key_I: self.mark_loop_start,
            Qt.Key.Key_O: self.mark_loop_end,
            Qt.Key.Key_L: self.clear_loop,
            Qt.Key.Key_Comma: lambda: self.step_speed(-1),
            Qt.Key.Key_Period: lambda: self.step_speed(1),
            Qt.Key.Key_C: lambda: self.set_counts_sound(not self.counts_sound),
        }.get(event.key())
        plain = Qt.KeyboardModifier.NoModifier, Qt.KeyboardModifier.KeypadModifier
        if does is None or event.modifiers() not in plain:
            return False
        does()
        return True

    def hideEvent(self, event: QHideEvent) -> None:
        """Nobody hears a transport that is not there."""
        self._metronome.stop()

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
        if head.playing:
            # While it runs, parts of a count are too quick to be read.
            place = place.partition(".")[0]
        self._where.setText(f"{place}    {say_seconds(head.at_s, 1)}")
        self._where.setMinimumWidth(self._where.fontMetrics().horizontalAdvance(WIDEST))
        self._loop.setEnabled(head.loop_s is not None or self._mark_s is not None)
