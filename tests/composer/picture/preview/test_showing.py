"""The preview window, run without a screen, its work in a process beside it."""

from pathlib import Path

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QComboBox, QPushButton, QSlider

from composer.commands.piece import load_piece
from composer.motion import strain_at
from composer.picture import palette
from composer.picture.preview import work as showing_work
from composer.picture.preview.beside import Beside
from composer.picture.preview.showing import Showing
from composer.picture.preview.work import Failed, Mended, Progress, Ran, Snags, strain_at_head
from composer.simulate.run import blocks

WAIT_MS = 280_000
pytestmark = pytest.mark.timeout(600)

SCORE = """title "Bench"
rig bench.rig.toml
phrase up 8
  2      full  smooth
  4      hold
  8      rest  smooth
section one at 1:1
  r.*    up
"""

TOO_FAST = SCORE.replace("  2      full", "  1/8      full")


@pytest.fixture
def score(tmp_path, small_rig):
    """A maker of a score beside its rig; returns its path."""

    def make(text=SCORE):
        (tmp_path / "bench.rig.toml").write_text(small_rig())
        (tmp_path / "bench.score").write_text(text)
        return str(tmp_path / "bench.score")

    return make


@pytest.fixture
def open_window(qtbot):
    """A maker of windows on a score."""

    def make(path, rig_path=None):
        window = Showing(load_piece(path), path, rig_path)
        qtbot.addWidget(window)
        window.resize(1280, 800)
        window.show()
        return window

    return make


def button(window, word):
    return next(each for each in window.findChildren(QPushButton) if each.text() == word)


def test_it_opens_at_once_and_the_simulated_run_comes_later(score, open_window, qtbot):
    window = open_window(score())
    assert window.ran("written") is None
    window.transport.move_to(1.0)
    assert not window.grab().isNull()
    qtbot.waitUntil(lambda: window.ran("written") is not None, timeout=WAIT_MS)
    assert "landings" in window._told.text()


def test_what_it_shows_is_what_the_simulator_says(score, open_window, qtbot):
    window = open_window(score(TOO_FAST))
    qtbot.waitUntil(lambda: window.ran("written") is not None, timeout=WAIT_MS)
    piece = load_piece(window._path)
    whole = list(blocks(piece.tracks, piece.rig, piece.abilities))
    time, strain = np.concatenate([b.time_s for b in whole]), np.hstack([b.strain for b in whole])
    for at in (0.3, 0.51, 2.0, 6.0):
        seen = strain_at_head(window.ran("written"), at)
        assert seen == pytest.approx([np.interp(at, time, row) for row in strain], abs=0.6 * 0.02 + 1e-6)
    window.transport.move_to(0.2)
    wanted = strain_at(piece.tracks, piece.abilities, np.array([0.2]))[:, 0]
    assert window.hang._wanted == pytest.approx(wanted)
    assert (window.hang._sensed < wanted - 0.05).all()


def test_as_wanted_there_is_no_ghost_and_nothing_sensed(score, open_window, qtbot):
    window = open_window(score(TOO_FAST))
    qtbot.waitUntil(lambda: window.ran("written") is not None, timeout=WAIT_MS)
    QTest.keyClick(window, Qt.Key.Key_M)
    window.transport.move_to(0.3)
    assert window.hang._sensed is None
    assert button(window, "As wanted").isChecked()
    button(window, "Simulated").click()
    window.transport.move_to(0.31)
    assert window.hang._sensed is not None


def test_retimed_is_worked_out_when_asked_for_and_keeps_the_place(score, open_window, qtbot):
    window = open_window(score(TOO_FAST))
    qtbot.waitUntil(lambda: window.ran("written") is not None, timeout=WAIT_MS)
    window.transport.move_to(4.0)
    QTest.keyClick(window, Qt.Key.Key_R)
    qtbot.waitUntil(lambda: window.timing == "retimed" and window.ran("retimed") is not None, timeout=WAIT_MS)
    now = window._ways["retimed"].piece
    assert now.tempo.say_place(window.transport.head_s) == "2:1"
    assert now.retimed
    assert not window._ways["retimed"].snags
    assert window._ways["written"].snags
    QTest.keyClick(window, Qt.Key.Key_R)
    assert window.timing == "written"
    assert window.transport.head_s == pytest.approx(4.0)


def test_a_play_file_or_a_piece_from_nowhere_has_one_way_of_timing(score, qtbot):
    window = Showing(load_piece(score()))
    qtbot.addWidget(window)
    assert not button(window, "Retimed").isEnabled()
    window.show_timing("retimed")
    assert window.timing == "written"


def test_the_cloths_head_and_the_transports_are_one(score, open_window):
    window = open_window(score())
    window.transport.move_to(2.5)
    assert window._cloth.head_s == pytest.approx(2.5)
    QTest.keyClick(window._cloth, Qt.Key.Key_Right)
    assert window.transport.head_s > 2.5


def test_keys_work_wherever_the_focus_is(score, open_window):
    window = open_window(score())
    for part in (window._cloth, window.hang):
        part.setFocus()
        QTest.keyClick(part, Qt.Key.Key_Space)
        assert window.transport.playing
        QTest.keyClick(part, Qt.Key.Key_Space)
        assert not window.transport.playing
        QTest.keyClick(part, Qt.Key.Key_S)
        assert window.hang.view == "side"
        QTest.keyClick(part, Qt.Key.Key_F)
    QTest.keyClick(window._cloth, Qt.Key.Key_D)
    assert window._theme is palette.LIGHT
    QTest.keyClick(window._cloth, Qt.Key.Key_Escape)
    assert not window.isVisible()


def test_a_fiber_chosen_in_one_picture_is_chosen_in_the_other(score, open_window):
    window = open_window(score())
    window.hang.fiber_clicked.emit(2)
    assert window._cloth.fiber == 2
    window._cloth.thread_clicked.emit(1, 3.0)
    assert window.hang._lit == {1}
    assert window.transport.head_s == pytest.approx(3.0)


def test_closing_ends_the_work(score, open_window):
    window = open_window(score())
    assert window._beside.busy
    window.close()
    assert not window._beside.busy


def test_work_that_ends_before_its_time_is_told_in_a_sentence(score, open_window, qtbot):
    window = open_window(score())
    window._beside._process.kill()
    qtbot.waitUntil(lambda: "ended before its time" in window._state.text(), timeout=WAIT_MS)


def test_what_fails_is_told_and_the_choice_goes_back(score, open_window):
    window = open_window(score())
    button(window, "Retimed").setChecked(True)
    window._hear(Failed("retiming", "pins are too close together"))
    assert window._state.text() == "retiming: pins are too close together"
    assert button(window, "As written").isChecked()


def test_every_control_has_a_name_for_those_who_do_not_see_it(score, open_window):
    window = open_window(score())
    for kind in (QPushButton, QSlider, QComboBox):
        assert all(each.accessibleName() for each in window.findChildren(kind))


def test_words_grow_with_the_window(score, open_window):
    window = open_window(score())
    small = window._title.fontInfo().pixelSize()
    window.resize(3840, 2160)
    assert window._title.fontInfo().pixelSize() > 2 * small


def test_the_work_tells_snags_progress_and_the_run_in_that_order(score):
    told = []
    showing_work.simulate(load_piece(score(TOO_FAST)), told.append)
    assert isinstance(told[0], Snags)
    assert len(told[0].snags) == 4
    assert isinstance(told[-1], Ran)
    shares = [each.share for each in told if isinstance(each, Progress)]
    assert shares == sorted(shares)
    assert shares[-1] == pytest.approx(1.0, abs=0.01)
    assert told[-1].tonight.missed == 4


def test_a_score_that_cannot_be_read_any_more_is_said_to_be_so(score):
    path, told = score(), []
    piece = load_piece(path)
    Path(path).write_text("nonsense")
    showing_work.mend(piece, path, None, told.append)
    assert isinstance(told[-1], Failed)


def test_retiming_carries_cues_along(score):
    path, told = score(TOO_FAST + '\ncue "top" at 1:3\n'), []
    showing_work.mend(load_piece(path), path, None, told.append)
    mended = told[-1]
    assert isinstance(mended, Mended)
    cue = mended.piece.cues[0]
    assert cue.at_s == pytest.approx(float(np.interp(2.0, mended.was_s, mended.now_s)))


def grumble(tell):
    raise RuntimeError("not today")


def count(upto, tell):
    for number in range(upto):
        tell(number)


def test_a_job_beside_tells_all_it_has_to_tell_in_order(qtbot):
    beside, heard = Beside(), []
    beside.said.connect(heard.append)
    with qtbot.waitSignal(beside.done, timeout=WAIT_MS) as done:
        beside.start(count, 200)
    assert heard == list(range(200))
    assert done.args == [True]
    assert not beside.busy


def test_a_job_that_goes_wrong_is_told_to_have_ended_and_nothing_is_printed(qtbot, capfd):
    beside = Beside()
    with qtbot.waitSignal(beside.done, timeout=WAIT_MS) as done:
        beside.start(grumble)
    assert done.args == [False]
    assert "Traceback" not in capfd.readouterr().err
