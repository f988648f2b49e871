"""The preview's window, run without a screen."""

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest

from composer.picture import png
from composer.picture.viewer import Viewer


@pytest.fixture
def viewer(make_scene):
    png.ready()
    shown = Viewer(make_scene())
    shown.resize(900, 600)
    shown.show()
    yield shown
    shown.close()


def press(viewer, key):
    QTest.keyClick(viewer, key)


def test_it_opens_on_the_whole_piece(viewer):
    assert viewer.shown == (0.0, 8.0)
    assert not viewer.grab().isNull()


def test_zooming_keeps_the_instant_under_the_pointer(viewer):
    viewer.zoom(0.5, 6.0)
    assert viewer.shown == (3.0, 7.0)


def test_no_zoom_or_scroll_leaves_the_piece(viewer):
    for _ in range(60):
        press(viewer, Qt.Key.Key_Plus)
    begin, end = viewer.shown
    assert end - begin == pytest.approx(0.5)
    for _ in range(200):
        press(viewer, Qt.Key.Key_Right)
    assert viewer.shown[1] == pytest.approx(8.0)
    press(viewer, Qt.Key.Key_0)
    assert viewer.shown == (0.0, 8.0)


def test_space_plays_from_the_head_and_pauses(viewer):
    viewer.place_head(3.0)
    press(viewer, Qt.Key.Key_Space)
    QTest.qWait(150)
    assert viewer.playing
    assert viewer.head_s > 3.0
    press(viewer, Qt.Key.Key_Space)
    assert not viewer.playing


def test_it_stops_at_the_end_and_starts_over(viewer):
    viewer.place_head(7.95)
    press(viewer, Qt.Key.Key_Space)
    QTest.qWait(250)
    assert (viewer.playing, viewer.head_s) == (False, 8.0)
    press(viewer, Qt.Key.Key_Space)
    assert viewer.head_s == 0.0


def test_a_click_puts_the_head_there(viewer):
    QTest.mouseClick(viewer, Qt.MouseButton.LeftButton, pos=viewer.rect().center())
    assert 0.0 < viewer.head_s < 8.0
