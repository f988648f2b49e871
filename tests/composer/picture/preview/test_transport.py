"""The transport, run without a screen."""

from itertools import pairwise

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QComboBox, QPushButton, QSlider, QWidget

from composer.picture.preview.transport import SPEEDS, Transport
from composer.score.tempo import TempoMap

ZERO = np.zeros(1)
BARS = TempoMap(ZERO, ZERO, np.array([2.0]), ZERO, ZERO, ZERO, np.array([4.0]))


@pytest.fixture
def transport(qtbot):
    shown = Transport()
    qtbot.addWidget(shown)
    shown.set_piece(BARS, 20.0)
    shown.show()
    return shown


def button(transport, word):
    return next(each for each in transport.findChildren(QPushButton) if each.text() == word)


def test_playing_moves_the_head_and_pausing_keeps_it(transport, qtbot):
    transport.move_to(3.0)
    with qtbot.waitSignals([transport.playing_changed, transport.moved]):
        transport.play()
    qtbot.waitUntil(lambda: transport.head_s > 3.05, timeout=20_000)
    transport.pause()
    at = transport.head_s
    QTest.qWait(60)
    assert transport.head_s == at
    assert not transport.playing


def test_the_place_is_said_as_bar_and_count_and_in_seconds(transport):
    transport.move_to(5.0)
    said = transport._where.text()
    assert "3:3" in said
    assert "5.0 s" in said


def test_scrubbing_goes_where_the_slider_is(transport, qtbot):
    slider = next(each for each in transport.findChildren(QSlider) if each.accessibleName() == "place in the piece")
    with qtbot.waitSignal(transport.moved) as said:
        slider.setValue(slider.maximum() // 4)
    assert said.args[0] == pytest.approx(5.0)
    assert transport.head_s == pytest.approx(5.0)


def test_a_passage_is_marked_at_the_head_and_played_round(transport, qtbot):
    transport.move_to(4.0)
    button(transport, "Loop from").click()
    transport.move_to(4.2)
    with qtbot.waitSignal(transport.loop_changed) as said:
        button(transport, "Loop to").click()
    assert said.args[0] == pytest.approx((4.0, 4.2))
    transport.set_speed(2.0)
    transport.play()
    seen = []
    transport.moved.connect(seen.append)
    qtbot.waitUntil(lambda: any(after < before for before, after in pairwise(seen)), timeout=20_000)
    transport.pause()
    assert all(4.0 <= at < 4.2 for at in seen)
    button(transport, "No loop").click()
    assert transport.head.loop_s is None


def test_at_the_end_it_stops_by_itself_and_says_so(transport, qtbot):
    transport.move_to(19.97)
    transport.play()
    qtbot.waitUntil(lambda: not transport.playing, timeout=20_000)
    assert transport.head_s == 20.0
    assert button(transport, "Play").accessibleName() == "Play"


def test_every_speed_can_be_chosen(transport):
    box = transport.findChild(QComboBox)
    for number, speed in enumerate(SPEEDS):
        box.setCurrentIndex(number)
        assert transport.head.speed == speed
    assert (SPEEDS[0], SPEEDS[-1]) == (0.25, 2.0)


class Pressing(QWidget):
    """Hands its keys to a transport."""

    def __init__(self, transport):
        super().__init__()
        self.transport, self.taken = transport, []

    def keyPressEvent(self, event):
        self.taken.append(self.transport.key(event))


def test_everything_has_a_key(transport, qtbot):
    window = Pressing(transport)
    qtbot.addWidget(window)
    window.show()
    transport.move_to(2.0)
    QTest.keyClick(window, Qt.Key.Key_I)
    transport.move_to(6.0)
    QTest.keyClick(window, Qt.Key.Key_O)
    assert transport.head.loop_s == pytest.approx((2.0, 6.0))
    QTest.keyClick(window, Qt.Key.Key_L)
    assert transport.head.loop_s is None
    QTest.keyClick(window, Qt.Key.Key_Period)
    assert transport.head.speed == 1.25
    QTest.keyClick(window, Qt.Key.Key_Comma)
    QTest.keyClick(window, Qt.Key.Key_Comma)
    assert transport.head.speed == 0.75
    QTest.keyClick(window, Qt.Key.Key_Space)
    assert transport.playing
    QTest.keyClick(window, Qt.Key.Key_Space)
    QTest.keyClick(window, Qt.Key.Key_Home)
    assert transport.head_s == 0.0
    assert all(window.taken)
    QTest.keyClick(window, Qt.Key.Key_X)
    QTest.keyClick(window, Qt.Key.Key_L, Qt.KeyboardModifier.ControlModifier)
    assert window.taken[-2:] == [False, False]


def test_every_control_has_a_name_for_those_who_do_not_see_it(transport):
    controls = [*transport.findChildren(QPushButton), *transport.findChildren(QSlider), *transport.findChildren(QComboBox)]
    assert len(controls) == 9
    assert all(each.accessibleName() for each in controls)


def test_without_a_program_for_sound_the_counts_cannot_be_switched_on_and_say_why(qtbot, monkeypatch, tmp_path):
    monkeypatch.setenv("PATH", str(tmp_path))
    silent = Transport()
    qtbot.addWidget(silent)
    assert not button(silent, "Counts").isEnabled()
    assert "no program for sound" in button(silent, "Counts").toolTip()
    silent.set_counts_sound(True)
    assert not silent.counts_sound


def test_the_counts_are_heard_while_it_plays_and_no_longer(qtbot, monkeypatch, tmp_path):
    heard = tmp_path / "heard"
    script = tmp_path / "aplay"
    script.write_text(f'#!/bin/sh\nexec /bin/cat > "{heard}"\n')
    script.chmod(0o755)
    monkeypatch.setenv("PATH", str(tmp_path))
    loud = Transport()
    qtbot.addWidget(loud)
    loud.set_piece(BARS, 20.0)
    loud.set_counts_sound(True)
    loud.play()
    qtbot.waitUntil(lambda: heard.exists() and heard.stat().st_size > 40_000, timeout=20_000)
    loud.pause()
    assert not loud._metronome.sounding
    assert np.abs(np.frombuffer(heard.read_bytes()[:40_000], dtype=np.int16).astype(int)).max() > 3000
    QTest.qWait(30)
    size = heard.stat().st_size
    QTest.qWait(120)
    assert heard.stat().st_size == size
