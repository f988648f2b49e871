"""The hang view, run without a screen."""

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QPoint, QPointF, Qt
from PySide6.QtGui import QImage
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QPushButton

from composer.limits.abilities import abilities_of
from composer.picture import palette
from composer.picture.hang.hang_view import HangView


@pytest.fixture
def rig(make_rig):
    return make_rig(4)


@pytest.fixture
def view(qtbot, rig):
    shown = HangView(rig, abilities_of(rig))
    qtbot.addWidget(shown)
    shown.resize(800, 500)
    shown.show()
    shown.grab()
    return shown


def pixels(view):
    shot = view.grab().toImage().convertToFormat(QImage.Format.Format_RGB32)
    return np.frombuffer(shot.constBits(), np.uint8).reshape(shot.height(), shot.width(), 4)[:, :, 2::-1].astype(int)


def end_of(view, fiber):
    """The pixel of a fiber's end, as last drawn."""
    view.grab()
    return view._lines[view._room.hanging.first[fiber + 1] - 1]


def test_a_fiber_that_contracts_is_drawn_shorter_by_its_strain(view):
    rest = end_of(view, 1)
    begin = view._lines[view._room.hanging.first[1]]
    view.show_strain([0.0, 0.25, 0.0, 0.0])
    full = end_of(view, 1)
    assert full[1] - begin[1] == pytest.approx(0.75 * (rest[1] - begin[1]))
    assert full[0] == pytest.approx(rest[0])


def test_what_is_wanted_is_a_ghost_only_where_it_differs_from_what_is_sensed(view):
    alike = [0.1, 0.1, 0.1, 0.1]
    view.show_strain(alike)
    plain = pixels(view)
    view.show_strain(alike, alike)
    assert (pixels(view) == plain).all()
    view.show_strain([0.3, 0.1, 0.1, 0.1], alike)
    changed = np.abs(pixels(view) - plain).max(axis=2) > 20
    columns = np.flatnonzero(changed.any(axis=0))
    x = end_of(view, 0)[0]
    assert len(columns)
    assert np.abs(columns - x).max() < 12


def test_where_nothing_is_sensed_what_is_wanted_is_shown(view):
    view.show_strain([0.2] * 4)
    plain = pixels(view)
    view.show_strain([0.2] * 4, [np.nan] * 4)
    assert (pixels(view) == plain).all()


def test_strain_for_another_number_of_fibers_is_refused(view):
    with pytest.raises(ValueError, match="4 fibers"):
        view.show_strain([0.0] * 3)


def test_a_click_on_a_fiber_says_which_and_one_beside_all_says_nothing(view, qtbot):
    begin, end = view._lines[4], view._lines[5]
    middle = (begin + end) / 2
    with qtbot.waitSignal(view.fiber_clicked) as said:
        QTest.mouseClick(view, Qt.MouseButton.LeftButton, pos=QPoint(round(middle[0]), round(middle[1])))
    assert said.args == [2]
    with qtbot.assertNotEmitted(view.fiber_clicked):
        QTest.mouseClick(view, Qt.MouseButton.LeftButton, pos=QPoint(5, 495))


def test_the_fiber_under_the_pointer_is_named(view, qtbot):
    plain = pixels(view)
    end = view._lines[7]
    with qtbot.waitSignal(view.fiber_hovered) as said:
        view._hover(view.fiber_at(QPointF(*end)))
    assert said.args == [3]
    # A raised label of a line's height, wider than it is high.
    changed = np.argwhere(np.abs(pixels(view) - plain).max(axis=2) > 5)
    high, wide = changed.max(axis=0) - changed.min(axis=0)
    assert 14 < high < 40
    assert wide > high


def test_a_drag_moves_the_picture_and_chooses_nothing(view, qtbot):
    was = end_of(view, 0).copy()
    with qtbot.assertNotEmitted(view.fiber_clicked):
        QTest.mousePress(view, Qt.MouseButton.LeftButton, pos=QPoint(*was.astype(int).tolist()))
        for x in (10, 30, 60):
            QTest.mouseMove(view, QPoint(int(was[0]) + x, int(was[1]) + 20))
        QTest.mouseRelease(view, Qt.MouseButton.LeftButton, pos=QPoint(int(was[0]) + 60, int(was[1]) + 20))
    now = end_of(view, 0)
    assert now[0] > was[0] + 20


@pytest.mark.parametrize(("key", "name"), [(Qt.Key.Key_S, "side"), (Qt.Key.Key_T, "three-quarter"), (Qt.Key.Key_F, "front")])
def test_each_view_has_a_key_and_a_button_with_its_word(view, key, name):
    view.set_view("side" if name == "front" else "front")
    QTest.keyClick(view, key)
    assert view.view == name
    checked = [button.text().lower() for button in view.findChildren(QPushButton) if button.isChecked()]
    assert checked == [name]
    view.set_view("front")
    button = next(each for each in view.findChildren(QPushButton) if each.text().lower() == name)
    button.click()
    assert view.view == name


def test_every_control_has_a_name_for_those_who_do_not_see_it(view):
    assert view.accessibleName()
    assert all(button.accessibleName() for button in view.findChildren(QPushButton))


def test_zoom_has_ends_and_0_shows_all_again(view):
    whole = end_of(view, 3).copy()
    for _ in range(80):
        QTest.keyClick(view, Qt.Key.Key_Plus)
    assert np.abs(end_of(view, 3) - end_of(view, 0)).max() < 1e5
    QTest.keyClick(view, Qt.Key.Key_0)
    assert end_of(view, 3) == pytest.approx(whole)


def test_lit_fibers_have_an_outline_in_the_colour_of_what_is_chosen(view):
    def chosen():
        return (np.abs(pixels(view) - np.array(palette.DARK.chosen)).max(axis=2) < 25).sum()

    assert chosen() == 0
    view.light({1, 99})
    assert chosen() > 100
    view.light(())
    assert chosen() == 0


def test_the_light_theme_is_light(view):
    view.set_theme(palette.LIGHT)
    assert np.median(pixels(view)) == pytest.approx(np.median(palette.LIGHT.ground), abs=3)


def test_a_rig_in_one_point_and_one_without_extent_are_drawn(qtbot, make_rig):
    rig = make_rig(2)
    fibers = tuple(replace(each, at_m=(0.0, 0.0, 0.0)) for each in rig.fibers)
    shown = HangView(replace(rig, fibers=fibers), abilities_of(rig))
    qtbot.addWidget(shown)
    shown.resize(220, 150)
    assert not shown.grab().isNull()


def test_another_rig_takes_the_place_of_the_first(view, make_rig):
    other = make_rig(7)
    view.set_rig(other, abilities_of(other))
    view.show_strain([0.1] * 7)
    assert len(view._room.names) == 7
    assert not view.grab().isNull()
