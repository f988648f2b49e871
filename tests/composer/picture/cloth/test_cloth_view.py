"""The living cloth under real mouse and key events."""

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, Qt
from PySide6.QtGui import QMouseEvent, QWheelEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QLineEdit, QVBoxLayout, QWidget

from composer.picture.cloth import over
from composer.picture.cloth.cloth_view import KEYS, ClothView
from composer.picture.palette import DARK, LIGHT
from composer.picture.scene import Stretch

LEFT = Qt.MouseButton.LeftButton
PLAIN = Qt.KeyboardModifier.NoModifier
ALT = Qt.KeyboardModifier.AltModifier
SHIFT = Qt.KeyboardModifier.ShiftModifier
CONTROL = Qt.KeyboardModifier.ControlModifier


def lined(weave):
    """The weave with all its moves made by line 5 of a phrase."""
    tracks = weave.tracks
    return replace(weave, tracks=replace(tracks, phrase_line=np.where(tracks.manner == 1, 5, 0).astype(np.int32)))


@pytest.fixture
def cloth(qtbot, make_weave):
    view = ClothView()
    qtbot.addWidget(view)
    view.resize(1280, 800)
    view.set_weave(lined(make_weave(until_s=2.1)))
    view.show()
    QApplication.processEvents()
    return view


@pytest.fixture
def said(cloth):
    """All signals of the cloth, as they come."""
    heard = []
    for name in ("thread_clicked", "hit_dragged", "hit_dropped", "head_moved", "snag_chosen", "stretch_changed"):
        getattr(cloth, name).connect(lambda *what, name=name: heard.append((name, *what)))
    return heard


def place(cloth, fiber, at_s):
    view = cloth._current()
    top, bottom = view.y_of(fiber)
    return QPoint(round(view.x_of(at_s)), round((top + bottom) / 2))


def named(said, name):
    return [one[1:] for one in said if one[0] == name]


def wheel(cloth, at, turn, held=PLAIN):
    where = QPointF(at)
    pressed, phase = Qt.MouseButton.NoButton, Qt.ScrollPhase.NoScrollPhase
    event = QWheelEvent(where, cloth.mapToGlobal(where), QPoint(), turn, pressed, held, phase, False)
    QApplication.sendEvent(cloth, event)


def key(cloth, what, held=PLAIN):
    QTest.keyClick(cloth, what, held)


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


def test_following_the_head_turns_the_page(cloth):
    cloth.show_stretch(0.0, 2.0)
    cloth.set_head(2.5, follow=True)
    assert cloth.shown == (pytest.approx(2.4), pytest.approx(4.4))


def pixels(view):
    """The picture, once it is whole."""
    view.grab()
    while not view.complete:
        QApplication.processEvents()
    picture = view.grab().toImage()
    held = np.frombuffer(picture.constBits(), np.uint8).reshape(picture.height(), picture.bytesPerLine() // 4, 4)
    return held[:, :, 2::-1].astype(int)


def test_the_threads_are_drawn_where_clicks_find_them(cloth):
    drawn = pixels(cloth)
    at = place(cloth, 2, 6.6)
    above = place(cloth, 1, 6.6)
    assert drawn[at.y(), at.x()].tolist() == DARK.contract[255].tolist()
    gap = (at.y() + above.y()) // 2
    assert any(drawn[y, at.x()].tolist() == list(DARK.ground) for y in range(gap - 6, gap + 7))


def test_a_snag_is_seen_without_its_colour(cloth):
    cloth.show_stretch(1.9, 2.2)
    snag = next(one for one in cloth.weave.snags if one.fiber == 0)
    at = place(cloth, 0, (snag.from_s + snag.to_s) / 2)
    grey = pixels(cloth).mean(axis=2)
    part = grey[at.y() - 6 : at.y() + 6, at.x() - 20 : at.x() + 20]
    assert part.max() > 240
    assert part.min() < 15


def test_a_ghost_splits_the_threads_that_it_moves_and_goes_with_the_next_score(cloth):
    before = pixels(cloth)
    times = cloth.weave.tracks.time_s.copy()
    times[2] = 5.0
    cloth.set_ghost(replace(cloth.weave.tracks, time_s=times))
    ghosted = pixels(cloth)
    view = cloth._current()
    top, bottom = (round(one) for one in view.y_of(0))
    x = round(view.x_of(2.6))
    column = ghosted[top:bottom, x]
    assert len({tuple(one) for one in column.tolist()}) >= 3
    other = place(cloth, 1, 2.6)
    assert ghosted[other.y(), x].tolist() == before[other.y(), x].tolist()
    cloth.set_weave(cloth.weave)
    assert np.array_equal(pixels(cloth)[top:bottom, x], before[top:bottom, x])


def test_a_lit_stretch_has_a_frame(cloth):
    before = pixels(cloth)
    cloth.select([Stretch(1, 5.0, 6.0), Stretch(2, 5.0, 6.0)])
    after = pixels(cloth)
    view = cloth._current()
    left = round(view.x_of(5.0))
    middle = round((view.y_of(1)[0] + view.y_of(2)[1]) / 2)
    assert (after[middle, left - 2 : left + 3] == np.array(DARK.chosen)).all(axis=1).any()
    inside = (middle, round(view.x_of(5.5)))
    assert after[inside].tolist() == before[inside].tolist()


def test_hits_are_marks_where_there_is_room_and_none_where_there_is_not(cloth, make_weave):
    view = cloth._current()
    assert len(over.hits_shown(view, cloth._shown.hits)) == 4
    cloth.set_weave(make_weave(count=300))
    assert over.hits_shown(cloth._current(), cloth._shown.hits) is None


def test_light_is_light_and_dark_is_dark(cloth):
    assert pixels(cloth).mean() < 90
    cloth.set_theme(LIGHT)
    assert pixels(cloth).mean() > 150


def test_without_a_score_it_says_so(qtbot):
    view = ClothView()
    qtbot.addWidget(view)
    view.resize(600, 400)
    view.show()
    assert not view.grab().isNull()
    assert view.accessibleDescription().startswith("No score yet")
    key(view, Qt.Key.Key_Right)
    QTest.mouseClick(view, LEFT, PLAIN, QPoint(300, 200))
    assert view.shown == (0.0, 1.0)


def test_a_score_that_goes_leaves_an_empty_cloth(cloth):
    cloth.set_weave(None)
    assert not cloth.grab().isNull()
    assert cloth.weave is None


def test_a_changed_score_keeps_place_and_zoom(cloth, make_weave):
    cloth.show_stretch(2.0, 4.0)
    cloth.set_weave(make_weave(until_s=2.2))
    assert cloth.shown == (2.0, 4.0)


def test_a_score_that_grows_is_shown_whole_where_the_whole_was_shown(cloth):
    tracks = cloth.weave.tracks
    cloth.set_weave(replace(cloth.weave, tracks=replace(tracks, duration_s=20.0)))
    assert cloth.shown == (0.0, 20.0)


def test_two_cloths_that_follow_one_another_come_to_rest(qtbot, make_weave):
    one, two = ClothView(), ClothView()
    for view in (one, two):
        qtbot.addWidget(view)
        view.set_weave(make_weave())
    told = []
    one.stretch_changed.connect(two.show_stretch)
    two.stretch_changed.connect(one.show_stretch)
    one.stretch_changed.connect(lambda *what: told.append(what))
    one.show_stretch(1.1 / 3, 2.3 / 7 + 1.9)
    assert len(told) == 1
    assert one.shown == pytest.approx(two.shown)


def test_everything_has_a_name_for_a_screen_reader(cloth):
    assert cloth.accessibleName() == "cloth of 4 fibers"
    for child in cloth.findChildren(QWidget):
        assert child.accessibleName()


def test_the_sheet_of_keys_names_every_key_once():
    names = [name for name, _ in KEYS]
    assert len(set(names)) == len(names)
    assert all(words for _, words in KEYS)


@pytest.mark.parametrize("size", [(320, 200), (1280, 800), (3840, 2160)])
def test_any_size_can_be_drawn(cloth, size):
    cloth.resize(*size)
    assert cloth.grab().width() == size[0]


def test_many_threads_are_drawn_whole_after_a_while(qtbot, make_weave):
    view = ClothView()
    qtbot.addWidget(view)
    view.resize(900, 500)
    view.set_weave(make_weave(count=1500))
    view.show()
    view.grab()
    qtbot.waitUntil(lambda: view.complete, timeout=30_000)
    here = view._current()
    x = round(here.x_of(6.6))
    column = pixels(view)[here.plan.top + 2 : here.plan.top + here.shown - 2, x]
    full = (np.abs(column - DARK.contract[255].astype(int)).max(axis=1) <= 1).mean()
    assert full > 0.9


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


def test_a_cloth_can_be_seen_as_far_as_is_said_and_no_further_without_that(cloth, said):
    tracks = cloth.weave.tracks
    later = replace(tracks, duration_s=tracks.duration_s + 5.0)
    cloth.set_ghost(later)
    cloth.reach(later.duration_s)
    assert cloth.shown == (0.0, later.duration_s)
    assert named(said, "stretch_changed") == [cloth.shown]
    cloth.reach(0.0)
    assert cloth.shown == (0.0, tracks.duration_s)
    cloth.show_stretch(1.0, 2.0)
    cloth.reach(later.duration_s)
    assert cloth.shown == (1.0, 2.0)
    cloth.show_all()
    assert cloth.shown == (0.0, later.duration_s)


def test_the_passage_that_is_looped_is_marked_from_its_start_to_its_end_and_nowhere_else(cloth):
    before = pixels(cloth)
    cloth.set_passage((0.5, 1.0))
    marked = np.flatnonzero((pixels(cloth) != before).any(axis=(0, 2)))
    view = cloth._current()
    assert marked.min() == pytest.approx(view.x_of(0.5), abs=3) and marked.max() == pytest.approx(view.x_of(1.0), abs=3)
    assert len(marked) >= 0.9 * (view.x_of(1.0) - view.x_of(0.5))
    cloth.set_passage(None)
    assert np.array_equal(pixels(cloth), before)
