"""What a mouse and keys do to a living cloth, what it says and what it shows."""

from dataclasses import replace

import numpy as np
from PySide6.QtCore import QPoint, QPointF, Qt
from PySide6.QtGui import QWheelEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

LEFT = Qt.MouseButton.LeftButton
PLAIN = Qt.KeyboardModifier.NoModifier
ALT = Qt.KeyboardModifier.AltModifier
SHIFT = Qt.KeyboardModifier.ShiftModifier
CONTROL = Qt.KeyboardModifier.ControlModifier


def lined(weave):
    """The weave with all its moves made by line 5 of a phrase."""
    tracks = weave.tracks
    return replace(weave, tracks=replace(tracks, phrase_line=np.where(tracks.manner == 1, 5, 0).astype(np.int32)))


def place(cloth, fiber, at_s):
    view = cloth._current()
    top, bottom = view.y_of(fiber)
    return QPoint(round(view.x_of(at_s)), round((top + bottom) / 2))


def named(said, name):
    return [one[1:] for one in said if one[0] == name]


def wheel(cloth, at, turn, held=PLAIN):
    where = QPointF(at)
    pressed, phase = Qt.MouseButton.NoButton, Qt.ScrollPhase.NoScrollPhase
    event = QWheelEvent(where, cloth.mapToGlobal(where), QPoint(), turn, pressed, held, phase, False)
    QApplication.sendEvent(cloth, event)


def key(cloth, what, held=PLAIN):
    QTest.keyClick(cloth, what, held)


def pixels(view):
    """The picture, once it is whole."""
    view.grab()
    while not view.complete:
        QApplication.processEvents()
    picture = view.grab().toImage()
    held = np.frombuffer(picture.constBits(), np.uint8).reshape(picture.height(), picture.bytesPerLine() // 4, 4)
    return held[:, :, 2::-1].astype(int)
