"""The living cloth by real keys."""

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLineEdit, QVBoxLayout, QWidget

from composer.picture.cloth.cloth_view import KEYS, ClothView
from composer.picture.palette import DARK

from .gestures import ALT, CONTROL, key, named, pixels


def test_arrows_move_the_head_by_the_grid_and_by_bars(cloth, said):
    key(cloth, Qt.Key.Key_Right)
    key(cloth, Qt.Key.Key_Right)
    key(cloth, Qt.Key.Key_Right, CONTROL)
    key(cloth, Qt.Key.Key_Left)
    assert [one[0] for one in named(said, "head_moved")] == pytest.approx([0.25, 0.5, 4.0, 3.75])
    key(cloth, Qt.Key.Key_End)
    assert cloth.head_s == 8.0
    key(cloth, Qt.Key.Key_Home)
    assert cloth.head_s == 0.0


def test_up_and_down_choose_a_thread_and_enter_says_it(cloth, said):
    cloth.set_head(1.0)
    for _ in range(3):
        key(cloth, Qt.Key.Key_Down)
    key(cloth, Qt.Key.Key_Up)
    key(cloth, Qt.Key.Key_Return)
    assert named(said, "thread_clicked") == [(1, 1.0)]
    assert "r.2 at 1:2" in cloth.accessibleDescription()
    assert "mm" in cloth.accessibleDescription()


def test_plus_and_minus_zoom_and_nought_shows_all(cloth):
    cloth.set_head(4.0)
    key(cloth, Qt.Key.Key_Plus)
    assert cloth.shown == (pytest.approx(1.2), pytest.approx(6.8))
    key(cloth, Qt.Key.Key_Minus)
    assert cloth.shown == (pytest.approx(0.0), pytest.approx(8.0))
    key(cloth, Qt.Key.Key_Plus)
    key(cloth, Qt.Key.Key_PageDown)
    assert cloth.shown[1] == pytest.approx(8.0)
    key(cloth, Qt.Key.Key_0)
    assert cloth.shown == (0.0, 8.0)


def test_tab_goes_through_snags_and_the_threads_hits_in_time_and_on_to_the_next_widget(qtbot, make_weave):
    window = QWidget()
    qtbot.addWidget(window)
    column = QVBoxLayout(window)
    view, after = ClothView(), QLineEdit()
    column.addWidget(view)
    column.addWidget(after)
    view.set_weave(make_weave(count=1, until_s=2.1))
    window.show()
    view.setFocus()
    view.choose_fiber(0)
    snags = len(view.weave.snags)
    told = []
    for _ in range(snags + 1):
        key(view, Qt.Key.Key_Tab)
        told.append(view.accessibleDescription().split()[0])
    assert sorted(told) == sorted(["snag"] * snags + ["hit"])
    key(view, Qt.Key.Key_Tab)
    assert window.focusWidget() is after


def test_escape_leaves_the_marks_so_that_tab_leaves_the_cloth(qtbot, make_weave):
    window = QWidget()
    qtbot.addWidget(window)
    column = QVBoxLayout(window)
    view, after = ClothView(), QLineEdit()
    column.addWidget(view)
    column.addWidget(after)
    view.set_weave(make_weave(until_s=2.1))
    window.show()
    view.setFocus()
    key(view, Qt.Key.Key_Tab)
    assert view._shown.snag >= 0
    key(view, Qt.Key.Key_Escape)
    key(view, Qt.Key.Key_Tab)
    assert window.focusWidget() is after


def chosen_hit(cloth):
    cloth.choose_fiber(0)
    cloth._change(hit=0)


def test_enter_takes_hold_of_a_hit_arrows_move_it_and_enter_lets_go(cloth, said):
    chosen_hit(cloth)
    key(cloth, Qt.Key.Key_Return)
    assert cloth.holds
    key(cloth, Qt.Key.Key_Right)
    key(cloth, Qt.Key.Key_Right)
    key(cloth, Qt.Key.Key_Left, ALT)
    key(cloth, Qt.Key.Key_Return)
    assert named(said, "hit_dragged") == [
        (1, 2.25, False), (1, 2.5, False), (1, pytest.approx(2.495), True),
    ]  # fmt: skip
    assert named(said, "hit_dropped") == [(True,)]


def test_escape_puts_a_held_hit_back(cloth, said):
    chosen_hit(cloth)
    key(cloth, Qt.Key.Key_Return)
    key(cloth, Qt.Key.Key_Right)
    key(cloth, Qt.Key.Key_Escape)
    assert named(said, "hit_dragged")[-1] == (1, pytest.approx(2.1), True)
    assert named(said, "hit_dropped") == [(False,)]


def test_enter_on_a_snag_chooses_it(cloth, said):
    cloth.choose_snag(1)
    key(cloth, Qt.Key.Key_Return)
    assert named(said, "snag_chosen") == [(1,)]


def test_a_chosen_snag_comes_into_view(cloth):
    cloth.show_stretch(6.0, 7.0)
    cloth.choose_snag(0)
    snag = cloth.weave.snags[0]
    assert cloth.shown[0] <= snag.from_s
    assert snag.to_s <= cloth.shown[1]


def test_the_grid_may_be_anything_above_nothing(cloth):
    cloth.set_grid(1.0)
    assert cloth.on_grid(2.4) == 2.0
    with pytest.raises(ValueError, match="more than 0"):
        cloth.set_grid(0.0)


def test_everything_has_a_name_for_a_screen_reader(cloth):
    assert cloth.accessibleName() == "cloth of 4 fibers"
    for child in cloth.findChildren(QWidget):
        assert child.accessibleName()


def test_the_sheet_of_keys_names_every_key_once():
    names = [name for name, _ in KEYS]
    assert len(set(names)) == len(names)
    assert all(words for _, words in KEYS)


def test_the_part_that_keys_go_to_has_a_frame(qtbot, make_weave):
    view = ClothView()
    qtbot.addWidget(view)
    view.resize(500, 400)
    view.set_weave(make_weave())
    view.show()
    view.activateWindow()
    view.setFocus()
    qtbot.waitUntil(view.hasFocus, timeout=10_000)
    assert (pixels(view)[1] == np.array(DARK.chosen)).all(axis=1).all()


def test_where_nothing_is_shown_there_is_nothing_to_scroll(cloth):
    cloth.show_stretch(0.5, 1.0)
    pixels(cloth)
    assert cloth._along.isVisible()
    cloth.set_weave(None)
    assert not cloth._along.isVisible() and not cloth._across.isVisible()
