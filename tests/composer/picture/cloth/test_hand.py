"""The living cloth under a real mouse."""

from dataclasses import replace

import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF
from PySide6.QtGui import QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from .gestures import ALT, CONTROL, LEFT, PLAIN, SHIFT, named, place, wheel


def test_a_click_says_which_thread_and_when(cloth, said):
    QTest.mouseClick(cloth, LEFT, PLAIN, place(cloth, 2, 5.0))
    ((fiber, at),) = named(said, "thread_clicked")
    assert (fiber, at) == (2, pytest.approx(5.0, abs=0.02))
    assert cloth.fiber == 2


def test_a_click_on_a_hatch_says_the_snag_after_the_thread(cloth, said):
    index = next(n for n, snag in enumerate(cloth.weave.snags) if snag.fiber == 1)
    cloth.show_stretch(1.5, 2.5)
    snag = cloth.weave.snags[index]
    QTest.mouseClick(cloth, LEFT, PLAIN, place(cloth, 1, (snag.from_s + snag.to_s) / 2))
    assert [one[0] for one in said if one[0] in ("thread_clicked", "snag_chosen")] == ["thread_clicked", "snag_chosen"]
    assert cloth.weave.snags[named(said, "snag_chosen")[0][0]].fiber == 1


def test_a_hit_is_dragged_to_the_grid_and_let_go(cloth, said):
    begin = place(cloth, 0, 2.1)
    QTest.mousePress(cloth, LEFT, PLAIN, begin)
    assert cloth.holds
    QTest.mouseMove(cloth, place(cloth, 0, 3.3))
    QTest.mouseMove(cloth, place(cloth, 0, 3.32))
    QTest.mouseRelease(cloth, LEFT, PLAIN, place(cloth, 0, 3.32))
    # The grid is a quarter of a count, and a count lasts a second.
    assert named(said, "hit_dragged") == [(1, 3.25, False)]
    assert named(said, "hit_dropped") == [(True,)]
    assert not cloth.holds


def test_with_alt_a_hit_goes_off_the_grid(cloth, said):
    QTest.mousePress(cloth, LEFT, ALT, place(cloth, 0, 2.1))
    event_at = place(cloth, 0, 3.33)
    move = QMouseEvent(QEvent.Type.MouseMove, QPointF(event_at), QPointF(cloth.mapToGlobal(event_at)), LEFT, LEFT, ALT)
    QApplication.sendEvent(cloth, move)
    ((segment, at, free),) = named(said, "hit_dragged")
    assert (segment, free) == (1, True)
    assert at == pytest.approx(3.33, abs=0.02)
    assert at != cloth.on_grid(at)


def test_while_one_is_dragged_all_that_its_number_moves_are_lit(cloth):
    QTest.mousePress(cloth, LEFT, PLAIN, place(cloth, 0, 2.1))
    assert cloth._shown.lit.tolist() == [1, 4, 7, 10]
    QTest.mouseRelease(cloth, LEFT, PLAIN, place(cloth, 0, 2.1))
    assert not len(cloth._shown.lit)


def test_a_press_on_a_hit_that_does_not_move_is_a_click(cloth, said):
    QTest.mouseClick(cloth, LEFT, PLAIN, place(cloth, 3, 2.1))
    assert named(said, "hit_dropped") == [(False,)]
    assert named(said, "hit_dragged") == []
    assert named(said, "thread_clicked")[0][0] == 3


def test_a_hit_stays_in_the_hand_when_the_score_is_drawn_anew(cloth, said):
    QTest.mousePress(cloth, LEFT, PLAIN, place(cloth, 0, 2.1))
    QTest.mouseMove(cloth, place(cloth, 0, 3.0))
    times = cloth.weave.tracks.time_s.copy()
    times[2] = 3.0
    cloth.set_weave(replace(cloth.weave, tracks=replace(cloth.weave.tracks, time_s=times)))
    assert cloth.holds
    QTest.mouseMove(cloth, place(cloth, 0, 3.5))
    assert named(said, "hit_dragged")[-1] == (1, 3.5, False)


@pytest.mark.parametrize("row", ["bars", "lanes"])
def test_the_rulers_move_the_head(cloth, said, row):
    view = cloth._current()
    y = view.plan.bars_top + 10 if row == "bars" else view.lanes_top + 20
    QTest.mousePress(cloth, LEFT, PLAIN, QPoint(round(view.x_of(3.0)), y))
    QTest.mouseMove(cloth, QPoint(round(view.x_of(5.0)), y))
    QTest.mouseRelease(cloth, LEFT, PLAIN, QPoint(round(view.x_of(5.0)), y))
    assert [one[0] for one in named(said, "head_moved")] == pytest.approx([3.0, 5.0], abs=0.02)
    assert cloth.head_s == pytest.approx(5.0, abs=0.02)


def test_dragging_the_cloth_scrolls_it(cloth):
    cloth.show_stretch(2.0, 4.0)
    QTest.mousePress(cloth, LEFT, PLAIN, place(cloth, 1, 3.5))
    for at in (3.2, 3.0):
        QTest.mouseMove(cloth, place(cloth, 1, at))
        assert cloth.shown[1] - cloth.shown[0] == pytest.approx(2.0)
    assert cloth.shown[0] > 2.0


def test_the_wheel_zooms_about_the_pointer(cloth):
    at = place(cloth, 1, 3.0)
    wheel(cloth, at, QPoint(0, 240))
    assert cloth.shown[1] - cloth.shown[0] == pytest.approx(8.0 * 0.85**2)
    assert cloth._current().s_of(at.x()) == pytest.approx(3.0, abs=0.02)


def test_the_wheel_with_shift_scrolls_and_with_control_grows_threads(cloth):
    cloth.show_stretch(2.0, 4.0)
    wheel(cloth, place(cloth, 1, 3.0), QPoint(0, -120), SHIFT)
    assert cloth.shown == (pytest.approx(2.2), pytest.approx(4.2))
    before = cloth._current().y_of(0)
    wheel(cloth, place(cloth, 1, 3.0), QPoint(0, 360), CONTROL)
    after = cloth._current().y_of(0)
    assert after[1] - after[0] >= before[1] - before[0]


def test_no_stretch_leaves_the_score(cloth):
    cloth.show_stretch(-5.0, 100.0)
    assert cloth.shown == (0.0, 8.0)
    cloth.show_stretch(7.5, 9.5)
    assert cloth.shown == (6.0, 8.0)
