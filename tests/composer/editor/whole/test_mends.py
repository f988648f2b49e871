"""The whole window: what a drag, a mend and a retiming write, and how it is taken back."""

import re
from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QEvent, Qt
from PySide6.QtGui import QTextCursor
from PySide6.QtWidgets import (
    QApplication,
    QLabel,
)

from composer.editor.messages import Mended
from composer.editor.snags_panel import SnagsPanel


def test_a_hit_dragged_rewrites_its_number_and_undo_takes_that_back(bench):
    window = bench.window
    cloth = window.stage.cloth
    cloth.hit_dragged.emit(0, 2.0, False)
    bench.until(lambda: "offset" in window.foot.said("word"), "what the drag does")
    assert window.pane.text == bench.SCORE
    assert cloth.weave.tracks.time_s[1] == pytest.approx(2.0)
    assert 8 in window.pane.looks.lit
    cloth.hit_dropped.emit(True)
    bench.until(lambda: window.pane.text != bench.SCORE, "the text changed")
    assert window.pane.text == bench.SCORE.replace("  1      full", "  2      full")
    bench.settled()
    window.do_undo()
    assert window.pane.text == bench.SCORE


def test_a_drag_that_is_put_back_changes_nothing(bench):
    window = bench.window
    window.strand.target_dragged.emit(0, 0.15, False)
    bench.until(lambda: window.stage.cloth.weave.tracks is not bench.known.picture.tracks, "the cloth as it would be")
    window.strand.knot_dropped.emit(False)
    bench.until(lambda: window.stage.cloth.weave.tracks is bench.known.picture.tracks, "the cloth as it is")
    assert window.pane.text == bench.SCORE


def test_typing_and_mends_are_one_history_whose_steps_have_names(bench, qtbot):
    window = bench.window
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    window.pane.moveCursor(QTextCursor.MoveOperation.End)
    qtbot.keyClicks(window.pane, "#")
    bench.settled()
    window.pane.undo()
    bench.settled()
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    choice = window.snags.mends.choices[0]
    window.snags.mends.buttons[0].click()
    bench.until(lambda: window.pane.text != bench.SCORE, "the mend")
    bench.settled()
    assert len(bench.known.checked.check.snags) == choice.snags_left
    window._name_history()
    assert window.doings["undo"].text() == f"&Undo: {choice.edit.say}"
    window.do_undo()
    assert window.pane.text == bench.SCORE


def test_the_choice_under_the_keys_is_a_ghost_on_the_cloth_before_it_is_taken(bench):
    window = bench.window
    window.do_next_snag()
    bench.until(lambda: window.snags.mends.choices, "choices")
    mends = window.snags.mends
    QApplication.sendEvent(mends.buttons[0], QEvent(QEvent.Type.Enter))
    assert window.stage.cloth._shown.ghost is mends.choices[0].after.tracks
    QApplication.sendEvent(mends.buttons[0], QEvent(QEvent.Type.Leave))
    assert window.stage.cloth._shown.ghost is bench.known.retimed.tracks
    assert window.pane.text == bench.SCORE


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
    assert lit and all(window.pane.text.split("\n")[line - 1] != bench.SCORE.split("\n")[line - 1] for line in lit)
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
    bench.until(lambda: window.pane.text != bench.SCORE, "the retiming in the text")
    bench.settled()
    assert not bench.known.checked.check.snags
    window.do_undo()
    assert window.pane.text == bench.SCORE


def test_a_phrase_can_have_a_copy_for_one_entry_alone(bench):
    window = bench.window
    window.pane.go_to(12, 3)
    bench.window._entry = 0
    window.do_copy_phrase()
    bench.until(lambda: window.pane.text != bench.SCORE, "the copy")
    assert window.pane.text.count("phrase lift") == 2
    bench.settled()
    assert np.allclose(bench.known.picture.tracks.time_s, bench.known.picture.tracks.time_s)
    window.do_undo()
    assert window.pane.text == bench.SCORE


def test_tab_and_foot_count_the_same_snags_and_so_do_the_rows_together(bench):
    window = bench.window
    count = bench.known.checked.count
    assert count > len(window.snags.rows) > 0
    assert window.foot.said("snags") == f"{count} snags" == window.lists.tabText(0)
    told = [window.snags.list.item(at).text() for at in range(len(window.snags.rows))]
    found = [re.search(r"\(([0-9]+) snags\)$", one) for one in told]
    assert sum(int(one[1]) if one else 1 for one in found) == count
