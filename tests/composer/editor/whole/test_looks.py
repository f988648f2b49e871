"""The whole window: room for everything in every size, names for every control, every part by keys."""

import pytest
from PySide6.QtCore import QSize, Qt
from PySide6.QtGui import QFontMetrics, QKeySequence
from PySide6.QtTest import QTest
from PySide6.QtWidgets import (
    QAbstractButton,
    QAbstractScrollArea,
    QAbstractSlider,
    QApplication,
    QComboBox,
    QLineEdit,
    QTabBar,
    QWidget,
)

from composer.editor.actions import ACTIONS
from composer.editor.keys_sheet import KeysSheet, as_html
from composer.picture.palette import THEMES

SIZES = (QSize(1280, 800), QSize(3840, 2160))


def test_the_table_of_the_rig_has_room_for_its_words_however_large_letters_are(bench):
    window = bench.window
    window.do_show_rig()
    for change in (window.do_larger, window.do_larger, window.do_smaller, window.do_smaller):
        change()
        bench.until(lambda: not window._letters.isActive(), "letters of the new size")
        table = window.showing.rig_page.table
        model, metrics = table.model(), table.fontMetrics()
        for column in range(model.columnCount()):
            assert table.columnWidth(column) > metrics.horizontalAdvance(model.index(0, column).data())
            heading = model.headerData(column, Qt.Orientation.Horizontal)
            letters = table.horizontalHeader().font()
            letters.setBold(True)
            assert table.columnWidth(column) > QFontMetrics(letters).horizontalAdvance(heading)
        assert table.rowHeight(0) > metrics.height()
    window.do_show_cloth()


@pytest.mark.parametrize("size", SIZES, ids=["1280x800", "3840x2160"])
@pytest.mark.parametrize("theme", THEMES)
def test_the_window_fits_and_draws_in_every_size_and_theme(bench, size, theme):
    window = bench.window
    window.set_theme(theme)
    window.do_find()
    # Letters follow the size, and the room that parts need follows the letters.
    for _ in range(2):
        window.resize(size)
        window._fit_letters()
        QApplication.processEvents()
    assert window.size() == size, "a part wants more room than there is"
    picture = window.grab().toImage()
    ground = THEMES[theme].panel
    at = picture.pixelColor(window.width() // 2, window.menuBar().height() // 2)
    assert (at.red(), at.green(), at.blue()) == tuple(ground)
    window.find_line.put_away()
    letters = window.pane.fontMetrics().height()
    assert letters >= (13 if size == SIZES[0] else 22)


CONTROLS = (QAbstractButton, QAbstractSlider, QComboBox, QLineEdit, QTabBar, QAbstractScrollArea)


def test_no_sentence_makes_the_window_wider_than_it_is(bench):
    window = bench.window
    QApplication.processEvents()
    room, least = window.centralWidget().width(), window.minimumSizeHint().width()
    for say in (lambda: window.foot.say("word", "words " * 200), lambda: window.notices.say("long", "words " * 200)):
        say()
        QApplication.processEvents()
        assert window.minimumSizeHint().width() <= least and window.centralWidget().width() == room
    window.notices.drop("long")
    window.foot.say("word", "")


def test_every_control_has_a_name_for_screen_readers(bench):
    window = bench.window
    window.do_find()
    window.do_go()
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    for leaf in (window.do_show_hang, window.do_show_rig, window.do_show_cloth):
        leaf()
        QApplication.processEvents()
    nameless = [
        f"{type(control).__name__} in {type(control.parent()).__name__}"
        for control in window.findChildren(QWidget)
        if isinstance(control, CONTROLS)
        and not control.objectName().startswith("qt_")
        and "ScrollBar" not in type(control).__name__
        and not control.accessibleName()
        and not (isinstance(control, QAbstractButton) and control.text())
        and type(control.parent()).__name__ not in ("QComboBox", "QComboBoxPrivateContainer", "QTableView", "QTabBar")
    ]
    assert nameless == []
    window.find_line.put_away()
    window.go_line.put_away()


def test_everything_in_the_table_is_in_the_menus_and_on_the_sheet_of_keys(bench):
    window = bench.window
    sheet = as_html()
    words = {one.text().replace("&", "") for menu in window.menuBar().actions() for one in menu.menu().actions()}
    for action in ACTIONS:
        assert any(word.startswith(action.word.replace("&", "")) for word in words), action.name
        if action.keys:
            assert action.says.replace("&", "&amp;").replace("<", "&lt;") in sheet
    keys = [action.keys for action in ACTIONS if action.keys]
    assert len({QKeySequence(one).toString() for one in keys}) == len(keys), "two actions share their keys"


@pytest.mark.parametrize("key", [Qt.Key.Key_Escape, Qt.Key.Key_F1])
def test_the_sheet_of_keys_lies_in_the_window_and_goes_by_escape_or_f1_back_to_where_one_was(bench, key):
    window = bench.window
    window.activateWindow()
    window.pane.setFocus()
    window.do_keys()
    sheet = window.findChild(KeysSheet)
    assert sheet.isVisible() and not sheet.isWindow()
    assert sheet.isAncestorOf(window.focusWidget())
    QTest.keyClick(window.focusWidget(), key)
    assert window.findChild(KeysSheet) is None
    assert window.focusWidget() is window.pane


def test_the_keys_go_round_all_parts_of_the_window(bench):
    window = bench.window
    window.activateWindow()
    window.pane.setFocus()
    bench.until(lambda: QApplication.focusWidget() is window.pane, "the keys in the text")
    seen = []
    for _ in range(5):
        seen.append(QApplication.focusWidget())
        window.do_next_part()
        QApplication.processEvents()
    assert seen[0] is seen[4] is window.pane
    assert {type(one).__name__ for one in seen[1:4]} == {"ClothView", "StrandView", "Wrapped"}
