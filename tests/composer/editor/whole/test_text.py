"""The whole window: text and cloth both ways, places, files, what moves and what prints."""

import os
import signal

import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, Qt
from PySide6.QtGui import QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import (
    QApplication,
)

from composer.editor.crew import READER, SOLVER
from composer.editor.deltas import Delta
from composer.editor.finding import Where, read_where


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
    window.resize(1280, 800)
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
