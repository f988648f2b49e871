"""The whole window with its workers: text and cloth both ways, mends, drags, names for every control."""

import os
import re
import signal
from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, QSize, Qt
from PySide6.QtGui import QFontMetrics, QKeySequence, QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import (
    QAbstractButton,
    QAbstractScrollArea,
    QAbstractSlider,
    QApplication,
    QComboBox,
    QLabel,
    QLineEdit,
    QTabBar,
    QWidget,
)

from composer.editor.actions import ACTIONS
from composer.editor.crew import READER, SOLVER
from composer.editor.deltas import Delta
from composer.editor.finding import Where, read_where
from composer.editor.keys_sheet import KeysSheet, as_html
from composer.editor.messages import Mended
from composer.editor.snags_panel import SnagsPanel
from composer.editor.window import ComposeWindow
from composer.picture.palette import THEMES

SCORE = """title "Bench"
rig bench.rig.toml
tempo 60

cue "turn" at 3:1

phrase lift 4
  1      full    linear
  3      rest

section one at 1:1
  r.1         lift
  r.2-4       lift   after 2

section two at 3:1
  r.*         lift   stretch 1/2
"""

TOO_FAST = "stretch 1/2"
SIZES = (QSize(1280, 800), QSize(3840, 2160))


@pytest.fixture(scope="module")
def home(tmp_path_factory):
    """A folder for the score, its rig and what the program keeps."""
    folder = tmp_path_factory.mktemp("compose")
    before = os.environ.get("DRAWCORD_STATE")
    os.environ["DRAWCORD_STATE"] = str(folder / "state")
    yield folder
    if before is None:
        os.environ.pop("DRAWCORD_STATE", None)
    else:
        os.environ["DRAWCORD_STATE"] = before


class Bench:
    """A window on a score, and the means to wait for it."""

    def __init__(self, app, folder):
        self.app, self.folder = app, folder
        self.window = ComposeWindow()
        self.window.crew.warm()
        assert self.window.session.open(str(folder / "bench.score"))
        self.window.show()

    def until(self, holds, what, seconds=60):
        """Wait for something; say what did not come."""
        import time

        end = time.monotonic() + seconds
        while not holds():
            assert time.monotonic() < end, f"it did not come: {what}; {self.window.notices.said}"
            self.app.processEvents()
            time.sleep(0.005)

    def settled(self):
        """Wait until the text at hand is read, checked and retimed."""
        known, crew = self.window.showing.known, self.window.crew

        def done():
            newest = known.picture is not None and known.picture.version == crew.version
            return newest and known.checked is not None and known.retimed is not None

        self.until(done, "a picture, a check and a retiming of the text")

    def text(self, text):
        """Begin anew with a text."""
        self.window.session.put_text(text)
        self.settled()

    @property
    def known(self):
        return self.window.showing.known


@pytest.fixture(scope="module")
def bench(qapp, home, small_rig):
    (home / "bench.rig.toml").write_text(small_rig())
    (home / "bench.score").write_text(SCORE)
    one = Bench(qapp, home)
    one.settled()
    yield one
    one.window.pane.document().setModified(False)
    one.window.close()


@pytest.fixture(autouse=True)
def begun_anew(bench):
    """Every test begins with the score as it is in the file."""
    bench.text(SCORE)
    bench.window.pane.looks.light([])


def test_a_text_shows_as_cloth_strand_snags_and_retiming(bench):
    window = bench.window
    assert window.stage.cloth.weave.tracks.fibers == 4
    assert len(window.stage.cloth.weave.snags) == len(bench.known.checked.check.snags) > 0
    assert len(window.snags.rows) >= 1
    assert len(window.retimed.hits) >= 1
    assert window.strand.fiber == 0


def test_typing_redraws_the_cloth_and_a_half_typed_line_leaves_it(bench, qtbot):
    window, pane = bench.window, bench.window.pane
    pane.go_to(3, 7, 2)
    qtbot.keyClicks(pane, "120")
    bench.settled()
    assert bench.known.picture.tracks.time_s[1] == pytest.approx(0.5)
    shown = window.stage.cloth.weave
    qtbot.keyClicks(pane, " to")
    bench.until(lambda: window.pane.looks.marks, "a mark")
    assert list(pane.looks.marks) == [3]
    assert window.foot.said("word") == pane.looks.marks[3][0].says
    assert window.stage.cloth.weave is shown
    for _ in range(3):
        qtbot.keyClick(pane, Qt.Key.Key_Backspace)
    bench.settled()
    assert not pane.looks.marks


def test_a_thread_puts_the_caret_on_the_line_that_moves_it_and_a_line_lights_its_threads(bench):
    window = bench.window
    window.thread_chosen(2, 2.5)
    bench.until(lambda: window.pane.place[0] == 8, "the caret on the phrase's line")
    assert window.showing.fiber == 2
    assert {8, 13} <= window.pane.looks.lit
    window.pane.go_to(13)
    bench.until(lambda: "moves 3 fibers from 1:3" in window.foot.said("place"), "what the line moves")


def test_a_hit_or_a_knot_puts_the_caret_on_the_line_that_lands_there_and_not_on_the_next(bench):
    window = bench.window
    cloth, strand = window.stage.cloth, window.strand
    view = cloth._current()
    top, bottom = view.y_of(0)
    QTest.mouseClick(cloth, Qt.MouseButton.LeftButton, pos=QPoint(round(view.x_of(1.0)), round((top + bottom) / 2)))
    bench.until(lambda: window.pane.place[0] == 8, "the caret on the line that lands at 1 s")
    window.pane.go_to(1)
    face = strand._face()
    at = QPoint(round(float(face.x_of(3.0))), round(float(face.y_of(0.0))))
    QTest.mouseClick(strand, Qt.MouseButton.LeftButton, pos=at)
    bench.until(lambda: window.pane.place[0] == 9, "the caret on the line that lands at 3 s")


def test_a_hit_dragged_rewrites_its_number_and_undo_takes_that_back(bench):
    window = bench.window
    cloth = window.stage.cloth
    cloth.hit_dragged.emit(0, 2.0, False)
    bench.until(lambda: "offset" in window.foot.said("word"), "what the drag does")
    assert window.pane.text == SCORE
    assert cloth.weave.tracks.time_s[1] == pytest.approx(2.0)
    assert 8 in window.pane.looks.lit
    cloth.hit_dropped.emit(True)
    bench.until(lambda: window.pane.text != SCORE, "the text changed")
    assert window.pane.text == SCORE.replace("  1      full", "  2      full")
    bench.settled()
    window.do_undo()
    assert window.pane.text == SCORE


def test_a_drag_that_is_put_back_changes_nothing(bench):
    window = bench.window
    window.strand.target_dragged.emit(0, 0.15, False)
    bench.until(lambda: window.stage.cloth.weave.tracks is not bench.known.picture.tracks, "the cloth as it would be")
    window.strand.knot_dropped.emit(False)
    bench.until(lambda: window.stage.cloth.weave.tracks is bench.known.picture.tracks, "the cloth as it is")
    assert window.pane.text == SCORE


def test_typing_and_mends_are_one_history_whose_steps_have_names(bench, qtbot):
    window = bench.window
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    choice = window.snags.mends.choices[0]
    qtbot.keyClicks(window.pane, "#")
    bench.settled()
    window.pane.undo()
    bench.settled()
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    choice = window.snags.mends.choices[0]
    window.snags.mends.buttons[0].click()
    bench.until(lambda: window.pane.text != SCORE, "the mend")
    bench.settled()
    assert len(bench.known.checked.check.snags) == choice.snags_left
    window._name_history()
    assert window.doings["undo"].text() == f"&Undo: {choice.edit.say}"
    window.do_undo()
    assert window.pane.text == SCORE


def test_the_choice_under_the_keys_is_a_ghost_on_the_cloth_before_it_is_taken(bench):
    window = bench.window
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    mends = window.snags.mends
    QApplication.sendEvent(mends.buttons[0], QEvent(QEvent.Type.Enter))
    assert window.stage.cloth._shown.ghost is mends.choices[0].after.tracks
    QApplication.sendEvent(mends.buttons[0], QEvent(QEvent.Type.Leave))
    assert window.stage.cloth._shown.ghost is bench.known.retimed.tracks
    assert window.pane.text == SCORE


def test_what_is_in_view_stays_there_while_choices_are_looked_at(bench):
    window = bench.window
    cloth, strand = window.stage.cloth, window.strand
    until = bench.known.retimed.tracks.duration_s
    assert until > bench.known.picture.tracks.duration_s
    cloth.show_stretch(until - 3.0, until)
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    shown = cloth.shown
    for choice in window.snags.mends.choices:
        window.snags.mends.ghost.emit(choice)
        assert cloth.shown == strand.shown == shown
    window.snags.mends.ghost.emit(None)
    assert cloth.shown == shown
    cloth.show_all()


def test_what_a_mend_has_written_is_lit_and_nothing_lit_stays_on_a_line_that_is_another_now(bench, qtbot):
    window = bench.window
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    choice = next(one for one in window.snags.mends.choices if one.way == "shrink")
    window.snags.mends.chosen.emit(choice)
    lit = window.pane.looks.lit
    assert lit and all(window.pane.text.split("\n")[line - 1] != SCORE.split("\n")[line - 1] for line in lit)
    window.pane.go_to(1)
    qtbot.keyClicks(window.pane, "#")
    assert window.pane.looks.lit == lit
    qtbot.keyClick(window.pane, Qt.Key.Key_Return)
    assert not window.pane.looks.lit


def test_the_keys_go_to_the_choices_as_soon_as_they_come(bench):
    window = bench.window
    window.activateWindow()
    window.do_next_snag()
    window.do_mend()
    bench.until(lambda: window.snags.mends.choices, "choices")
    assert window.focusWidget() is window.snags.mends.buttons[0]


def test_choices_that_were_looked_for_before_the_retiming_came_are_looked_for_again(bench):
    window = bench.window
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    first = window.snags.mends.buttons[0]
    retimed, bench.known.retimed = bench.known.retimed, None
    window._find_mends(window.snags.current)
    assert window._mends_early
    bench.known.retimed = retimed
    window._hear(retimed)
    assert not window._mends_early
    bench.until(lambda: window.snags.mends.buttons and window.snags.mends.buttons[0] is not first, "choices again")


def test_after_a_mend_the_next_snag_is_the_one_behind_it(bench):
    panel = SnagsPanel()
    rows = [replace(bench.known.checked.rows[0], from_s=float(at), line=at) for at in (1, 2, 3)]
    panel.show_rows(rows)
    panel.step(1)
    panel.step(1)
    panel.show_rows([rows[0], rows[2]])
    assert panel.current is None
    panel.step(1)
    assert panel.current is rows[2]
    panel.show_rows(rows[:2])
    panel.step(-1)
    assert panel.current is rows[1]
    panel.deleteLater()


def test_why_a_way_does_not_help_is_said_with_its_name(bench):
    panel = SnagsPanel()
    panel.mends.show_mended(Mended((), {"time": "No amount of time mends it."}))
    said = [label.text() for label in panel.mends.findChildren(QLabel)]
    assert "Give it time: no amount of time mends it." in said
    panel.deleteLater()


def test_a_passage_is_marked_on_the_cloth_and_what_was_said_of_taking_it_goes_with_the_next_edit(bench, qtbot):
    window = bench.window
    window._go_to_seconds(1.0)
    window.do_loop_from()
    window._go_to_seconds(2.0)
    window.do_loop_to()
    assert window.stage.cloth._passage == (pytest.approx(1.0), pytest.approx(2.0))
    window.do_no_loop()
    assert window.stage.cloth._passage is None
    window.notices.say("take", "Something about a passage.")
    qtbot.keyClicks(window.pane, " ")
    assert "take" not in window.notices.said


def test_all_of_the_retiming_can_be_taken_into_the_text_and_out_again(bench):
    window = bench.window
    assert bench.known.checked.check.snags
    window.do_take_all()
    bench.until(lambda: window.pane.text != SCORE, "the retiming in the text")
    bench.settled()
    assert not bench.known.checked.check.snags
    window.do_undo()
    assert window.pane.text == SCORE


def test_a_phrase_can_have_a_copy_for_one_entry_alone(bench):
    window = bench.window
    window.pane.go_to(12, 3)
    bench.window._entry = 0
    window.do_copy_phrase()
    bench.until(lambda: window.pane.text != SCORE, "the copy")
    assert window.pane.text.count("phrase lift") == 2
    bench.settled()
    assert np.allclose(bench.known.picture.tracks.time_s, bench.known.picture.tracks.time_s)
    window.do_undo()
    assert window.pane.text == SCORE


def test_words_are_completed(bench, qtbot):
    window, pane = bench.window, bench.window.pane
    pane.go_to(13, 100)
    qtbot.keyClick(pane, Qt.Key.Key_Return)
    qtbot.keyClicks(pane, "r.1  li")
    bench.until(lambda: window.offers.isVisible(), "offers")
    assert "lift" in window.offers.item(0).text()
    # Return goes on to the next line, where nothing was chosen; Tab takes.
    qtbot.keyClick(pane, Qt.Key.Key_Tab)
    assert pane.textCursor().block().text() == "  r.1  lift"
    pane.go_to(14, 100)


def test_a_new_score_waits_for_its_rig_and_offers_those_that_are_there(bench, home):
    window = bench.window
    window.pane.document().setModified(False)
    window.do_new()
    assert window.pane.place == (2, 9)
    bench.until(window.offers.isVisible, "the rigs that are there")
    assert "bench.rig.toml" in window.offers.item(0).text()
    window.offers.take()
    assert "\nrig     bench.rig.toml\n" in window.pane.text
    bench.settled()
    window.pane.document().setModified(False)
    window.session.open(str(home / "bench.score"))


def test_hovering_says_what_a_word_means(bench):
    window = bench.window
    window.pane.go_to(12, 4)
    window.do_explain()
    bench.until(lambda: "r.1" in window.pane.accessibleDescription(), "what r.1 is")


@pytest.mark.parametrize(
    ("text", "where"),
    [
        ("12", Where(line=12)),
        ("line 12", Where(line=12)),
        ("9:1", Where(bar=9, count=1.0)),
        ("2.5s", Where(seconds=2.5)),
        ("turn", Where(name="turn")),
        ("", None),
    ],
)
def test_a_line_a_place_a_time_and_a_name_are_told_apart(text, where):
    assert read_where(text) == where


def test_one_can_go_to_a_line_a_place_and_a_cue(bench):
    window = bench.window
    window.go_where(Where(line=7))
    assert window.pane.place[0] == 7
    window.go_where(Where(bar=2, count=1.0))
    bench.until(lambda: window.stage.transport.head_s == pytest.approx(4.0), "the head at 2:1")
    window.go_where(Where(name="turn"))
    assert window.stage.transport.head_s == pytest.approx(8.0)
    assert window.pane.place[0] == 5
    window.go_where(Where(name="nowhere"))
    assert "nowhere" in window.foot.said("word")


def test_a_rig_file_that_changes_is_read_again_and_one_that_is_broken_leaves_the_last(bench, home, small_rig):
    window, path = bench.window, home / "bench.rig.toml"
    window.do_show_rig()
    good = path.read_text()
    try:
        path.write_text(small_rig(stroke=0.2))
        window.session.look()
        bench.until(lambda: bench.known.abilities.stroke[0] == pytest.approx(0.2), "the new rig")
        path.write_text("[rig]\nnonsense\n")
        window.session.look()
        bench.until(lambda: "other" in window.notices.said, "what is wrong with the rig")
        assert "bench.rig.toml:2" in window.notices.said["other"]
        assert window.showing.rig_page._wrong.isVisibleTo(window.showing.rig_page)
        assert window.stage.cloth.weave is not None
    finally:
        path.write_text(good)
        window.session.look()
        bench.until(lambda: bench.known.abilities.stroke[0] == pytest.approx(0.3), "the rig as it was")
        bench.until(lambda: "other" not in window.notices.said, "no word of it")
        window.do_show_cloth()


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


@pytest.mark.parametrize("role", [READER, SOLVER])
def test_a_worker_that_is_killed_is_survived_with_a_sentence(bench, role):
    window = bench.window
    os.kill(window.crew.worker(role).process_id, signal.SIGKILL)
    bench.until(lambda: "worker" in window.notices.said, "a sentence")
    assert "was ended by signal 9; another has taken up the text" in window.notices.said["worker"]
    window.pane.change([Delta(0, 0, "# on\n")])
    bench.settled()
    window.notices.drop("worker")


def test_the_fibers_hang_and_move_with_the_head(bench):
    window = bench.window
    window.do_show_hang()
    bench.until(lambda: bench.known.run is not None and bench.known.run.share >= 1.0, "the whole simulated run")
    window.stage.transport.move_to(1.0)
    assert window.showing.hang._wanted[0] == pytest.approx(0.3, abs=1e-6)
    assert 0.2 < window.showing.hang._sensed[0] <= 0.301
    window.do_play()
    assert window.stage.transport.playing
    window.do_play()
    window.do_half_speed()
    assert window.stage.transport.head.speed == 0.5
    window.do_half_speed()
    window.do_show_cloth()


def test_what_is_played_can_be_the_retiming(bench):
    window = bench.window
    window.stage.transport.move_to(9.0)
    window.doings["simulated"].setChecked(True)
    window.do_simulated(True)
    warp = bench.known.warp(True)
    assert window.stage.transport.head_s == pytest.approx(warp.now(9.0))
    assert window.stage.cloth.head_s == pytest.approx(9.0, abs=1e-6)
    bench.until(lambda: bench.known.run is not None and bench.known.run.retimed, "a run as retimed")
    window.do_simulated(False)
    window.doings["simulated"].setChecked(False)


def test_cloth_and_snags_print_as_pages(bench, home):
    window = bench.window
    window.print_to(str(home / "wall"))
    bench.until(lambda: "Printed" in window.notices.said.get("print", ""), "a file")
    assert (home / "wall.pdf").read_bytes().startswith(b"%PDF")
    window.notices.drop("print")


def test_a_print_can_be_stopped_and_leaves_nothing(bench, home):
    window = bench.window
    window.print_to(str(home / "none"))
    window.notices.choose("print", "Stop printing")
    assert "nothing was written" in window.notices.said["print"]
    bench.settled()
    assert not (home / "none.pdf").exists()
    window.notices.drop("print")


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


def test_the_foot_says_kept_only_as_long_as_changes_are_kept(bench, qtbot):
    window, keeper = bench.window, bench.window.session.keeper
    qtbot.keyClicks(window.pane, " ")
    assert window.foot.said("saved") == "not saved; kept"
    keeper._fail(OSError(28, "No space left on device"))
    assert window.foot.said("saved") == "neither saved nor kept"
    assert "Changes cannot be kept" in window.notices.said["keeping"]
    keeper.rewrite()
    bench.until(lambda: keeper.keeps, "the next try to keep them")
    assert window.foot.said("saved") == "not saved; kept"
    assert "keeping" not in window.notices.said


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


def test_tab_and_foot_count_the_same_snags_and_so_do_the_rows_together(bench):
    window = bench.window
    count = bench.known.checked.count
    assert count > len(window.snags.rows) > 0
    assert window.foot.said("snags") == f"{count} snags" == window.lists.tabText(0)
    told = [window.snags.list.item(at).text() for at in range(len(window.snags.rows))]
    found = [re.search(r"\(([0-9]+) snags\)$", one) for one in told]
    assert sum(int(one[1]) if one else 1 for one in found) == count


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


def test_closing_with_something_unsaved_asks_in_a_bar_and_goes_on(bench):
    window = bench.window
    window.pane.change([Delta(0, 0, "# on\n")])
    assert not window.close()
    assert "not saved" in window.notices.said["close"]
    window.notices.choose("close", "Go on writing")
    assert window.isVisible()
    window.pane.undo()


def test_a_click_on_the_cloth_is_a_click_on_a_thread(bench):
    window = bench.window
    cloth = window.stage.cloth
    window.resize(SIZES[0])
    QApplication.processEvents()
    cloth.grab()
    view = cloth._current()
    ratio = cloth.devicePixelRatioF()
    y = (view.plan.top + (view.rows.top[3] + view.rows.bottom[3]) / 2 - view.scroll) / ratio
    place = QPointF(view.x_of(2.6) / ratio, y)
    for kind in (QEvent.Type.MouseButtonPress, QEvent.Type.MouseButtonRelease):
        event = QMouseEvent(
            kind, place, cloth.mapToGlobal(place), Qt.MouseButton.LeftButton, Qt.MouseButton.LeftButton,
            Qt.KeyboardModifier.NoModifier,
        )  # fmt: skip
        QApplication.sendEvent(cloth, event)
    assert window.showing.fiber == 3
    bench.until(lambda: window.pane.place[0] == 8, "the caret on the line that moves it")
