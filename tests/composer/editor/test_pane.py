"""The text: changes told as they are made, colours, marks, keys, what may be pasted."""

import numpy as np
import pytest
from PySide6.QtCore import QMimeData, Qt
from PySide6.QtGui import QTextCursor
from PySide6.QtWidgets import QApplication

from composer.editor.deltas import Delta, Units
from composer.editor.looks import Mark
from composer.editor.pane import TextPane
from composer.editor.text_colours import STYLES
from composer.edits.colouring import CLASSES
from composer.picture.palette import THEMES, contrast
from composer.score.bounds import most

TEXT = 'title "One"\n\nphrase lift 4\n  2  full\n  4  rest\n\nsection one at 1:1\n  reeds  lift\n'


@pytest.fixture
def pane(qtbot):
    made = TextPane()
    qtbot.addWidget(made)
    made.resize(700, 500)
    made.open_text(TEXT)
    made.show()
    return made


@pytest.fixture
def mirror(pane):
    """A text that hears nothing but the changes."""
    units = Units(pane.text)
    pane.changed.connect(units.change)
    return units


def at(pane, line, column=1):
    pane.go_to(line, column)
    return pane


def test_every_way_to_change_the_text_is_told_as_it_is(pane, mirror, qtbot):
    def same():
        assert mirror.text == pane.text

    qtbot.keyClicks(at(pane, 4, 3), "1 h")
    same()
    pane.insertPlainText("\u00f6r \U0001f300")
    same()
    for key in (Qt.Key.Key_Return, Qt.Key.Key_Tab, Qt.Key.Key_Backtab, Qt.Key.Key_Backspace, Qt.Key.Key_Delete):
        qtbot.keyClick(pane, key)
        same()
    pane.change([Delta(0, 5, "cue"), Delta(20, 0, "x\ny")])
    same()
    pane.undo()
    same()
    pane.redo()
    same()
    pane.selectAll()
    pane.cut()
    same()
    pane.undo()
    same()
    pane.selectAll()
    pane.insertPlainText("all new\n\nand more")
    same()
    pane.toggle_comment()
    same()
    while pane.document().isUndoAvailable():
        pane.undo()
        same()
    assert pane.text == TEXT


def test_any_random_edits_are_told_as_they_are(pane, mirror):
    dice = np.random.default_rng(3)
    for _ in range(150):
        length = len(mirror)
        start = int(dice.integers(0, length + 1))
        out = int(dice.integers(0, min(9, length - start) + 1))
        cursor = QTextCursor(pane.document())
        cursor.setPosition(start)
        cursor.setPosition(start + out, QTextCursor.MoveMode.KeepAnchor)
        cursor.insertText(str(dice.choice(["", "a", "\n", "b\nc", "\u00e4\u00a0", "  2 full"])))
        if dice.random() < 0.2:
            pane.undo()
        assert mirror.text == pane.text


def test_an_edit_of_many_places_is_one_step_and_undo_leaves_the_caret_there(pane):
    at(pane, 8, 3)
    pane.change([Delta(TEXT.index("full"), 4, "0.5"), Delta(TEXT.index("rest"), 4, "0.1")])
    assert "0.5" in pane.text
    assert "0.1" in pane.text
    pane.undo()
    assert pane.text == TEXT
    assert pane.place[0] == 4


def test_nothing_of_a_text_is_made_into_something_else(pane):
    text = "a\u00a0b\u2028c \u3000d\tz\n"
    pane.open_text(text)
    assert pane.text == text


def test_return_keeps_the_indent_and_opens_that_of_a_block(pane, qtbot):
    at(pane, 7, 100)
    qtbot.keyClick(pane, Qt.Key.Key_Return)
    assert pane.textCursor().block().text() == "  "
    qtbot.keyClicks(pane, "reeds lift")
    qtbot.keyClick(pane, Qt.Key.Key_Return)
    assert pane.textCursor().block().text() == "  "
    at(pane, 1, 100)
    qtbot.keyClick(pane, Qt.Key.Key_Return)
    assert pane.textCursor().block().text() == ""


def test_return_on_a_line_of_blanks_alone_ends_the_block_and_takes_them_away(pane, qtbot):
    at(pane, 7, 100)
    qtbot.keyClick(pane, Qt.Key.Key_Return)
    blank = pane.textCursor().block()
    qtbot.keyClick(pane, Qt.Key.Key_Return)
    assert blank.text() == "" and pane.textCursor().block().text() == "" and pane.textCursor().positionInBlock() == 0
    assert pane.textCursor().blockNumber() == blank.blockNumber() + 1


def test_lines_in_view_are_coloured_by_what_their_words_are(pane, qtbot):
    def bold(line, column):
        ranges = pane.document().findBlockByNumber(line - 1).layout().formats()
        return any(one.start <= column - 1 < one.start + one.length and one.format.fontWeight() > 500 for one in ranges)

    qtbot.waitUntil(lambda: bold(3, 1), timeout=5000)
    assert not bold(4, 3)
    # The same words mean something else where another block is open.
    at(pane, 3)
    qtbot.keyClicks(pane, "#")
    qtbot.waitUntil(lambda: not bold(3, 1), timeout=5000)


def test_a_long_text_costs_only_what_is_seen_of_it(pane):
    pane.open_text("phrase long 4\n" + "  2  full\n" * 100_000)
    coloured = 0
    block = pane.document().firstBlock()
    while block.isValid():
        coloured += bool(block.layout().formats())
        block = block.next()
    assert 10 < coloured < 200


def test_every_class_of_words_has_a_style_that_can_be_read_in_every_theme():
    assert set(STYLES) == set(CLASSES)
    for theme in THEMES.values():
        for name, style in STYLES.items():
            assert contrast(getattr(theme, style.colour), theme.field) >= 4.5, f"{name} in {theme.name}"


def test_what_is_wrong_is_marked_at_its_column(pane):
    pane.looks.set_marks([Mark(8, 10, 14, "no phrase 'lift'")])
    (extra,) = [one for one in pane.extraSelections() if one.cursor.hasSelection()]
    assert extra.cursor.selectedText() == "lift"
    pane.looks.set_marks([Mark(2, 1, 2, "the line ends here"), Mark(99, 1, 2, "beyond")])
    pane.grab()


def test_a_paste_beyond_what_a_score_may_have_is_refused_with_a_sentence(pane, qtbot):
    data = QMimeData()
    data.setText("x" * (50 << 20))
    with qtbot.waitSignal(pane.refused) as told:
        pane.insertFromMimeData(data)
    assert "52,428,800 bytes" in told.args[0]
    assert f"{most('file'):,}" in told.args[0]
    assert pane.text == TEXT


def test_a_paste_of_more_lines_than_a_score_may_have_is_refused_too(pane, qtbot):
    data = QMimeData()
    data.setText("\n" * most("lines"))
    with qtbot.waitSignal(pane.refused) as told:
        pane.insertFromMimeData(data)
    assert "it may have 200,000" in told.args[0]
    assert pane.text == TEXT


def test_a_paste_is_text_alone_with_plain_line_ends(pane):
    data = QMimeData()
    data.setText("one\r\ntwo\rthree")
    data.setHtml("<b>one</b>")
    pane.open_text("")
    pane.insertFromMimeData(data)
    assert pane.text == "one\ntwo\nthree"


def test_columns_count_characters_also_beyond_the_basic_plane(pane):
    pane.open_text("\U0001f300\U0001f300 lift\n")
    at(pane, 1, 4)
    assert pane.place == (1, 4)
    pane.go_to(1, 4, 4)
    assert pane.textCursor().selectedText() == "lift"


def test_comments_come_and_go_on_all_lines_chosen(pane):
    cursor = pane.textCursor()
    cursor.setPosition(TEXT.index("  2"))
    cursor.setPosition(TEXT.index("\n\nsection"), QTextCursor.MoveMode.KeepAnchor)
    pane.setTextCursor(cursor)
    pane.toggle_comment()
    assert "  # 2  full\n  # 4  rest\n" in pane.text
    pane.toggle_comment()
    assert pane.text == TEXT


def test_a_pointer_that_rests_and_a_key_both_ask_what_a_word_means(pane, qtbot):
    at(pane, 8, 11)
    with qtbot.waitSignal(pane.asked) as told:
        pane.ask_here()
    assert told.args[:2] == [8, 11]


def test_the_caret_at_rest_is_told(pane, qtbot):
    with qtbot.waitSignal(pane.placed) as told:
        at(pane, 7, 9)
    assert told.args == [7, 9]
    QApplication.processEvents()


def test_a_caret_that_was_in_view_stays_there_when_the_text_has_less_room(pane):
    pane.open_text("\n".join(f"line {n}" for n in range(200)))
    pane.go_to(1)
    rows = pane.viewport().height() // pane.fontMetrics().height()
    pane.go_to(rows - 2)
    assert pane.cursorRect().bottom() <= pane.viewport().height()
    pane.resize(700, 400)
    QApplication.processEvents()
    assert pane.cursorRect().bottom() <= pane.viewport().height()
    pane.verticalScrollBar().setValue(150)
    pane.resize(700, 300)
    assert pane.verticalScrollBar().value() == 150
