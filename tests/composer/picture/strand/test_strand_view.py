"""A strand under real mouse and key events."""

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, Qt
from PySide6.QtGui import QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QLineEdit, QVBoxLayout, QWidget

from composer.picture.cloth.cloth_view import ClothView
from composer.picture.palette import DARK, LIGHT
from composer.picture.strand.strand_view import KEYS, StrandView

LEFT = Qt.MouseButton.LeftButton
PLAIN = Qt.KeyboardModifier.NoModifier
ALT = Qt.KeyboardModifier.AltModifier


@pytest.fixture
def strand(qtbot, make_weave):
    view = StrandView()
    qtbot.addWidget(view)
    view.resize(1000, 260)
    weave = make_weave(until_s=2.1)
    view.set_strand(weave, 1, snags=[(2.0, 2.1, "needs 1200 mm/s, can do 240")])
    view.show()
    QApplication.processEvents()
    return view


@pytest.fixture
def said(strand):
    heard = []
    for name in ("time_dragged", "target_dragged", "knot_dropped", "knot_clicked", "head_moved", "stretch_changed"):
        getattr(strand, name).connect(lambda *what, name=name: heard.append((name, *what)))
    return heard


def named(said, name):
    return [one[1:] for one in said if one[0] == name]


def place(strand, at_s, strain):
    face = strand._face()
    return QPoint(round(float(face.x_of(at_s))), round(float(face.y_of(strain))))


def key(strand, what, held=PLAIN):
    QTest.keyClick(strand, what, held)


def pixels(view):
    picture = view.grab().toImage()
    held = np.frombuffer(picture.constBits(), np.uint8).reshape(picture.height(), picture.bytesPerLine() // 4, 4)
    return held[:, :, 2::-1].astype(int)


def test_a_knot_dragged_sideways_changes_its_time_alone(strand, said):
    QTest.mousePress(strand, LEFT, PLAIN, place(strand, 2.1, 0.3))
    QTest.mouseMove(strand, place(strand, 3.0, 0.28))
    QTest.mouseMove(strand, place(strand, 4.02, 0.1))
    QTest.mouseRelease(strand, LEFT, PLAIN, place(strand, 4.02, 0.1))
    assert named(said, "time_dragged") == [(4, 3.0, False), (4, 4.0, False)]
    assert named(said, "target_dragged") == []
    assert named(said, "knot_dropped") == [(True,)]


def test_a_knot_dragged_upright_changes_its_target_alone(strand, said):
    QTest.mousePress(strand, LEFT, PLAIN, place(strand, 2.1, 0.3))
    QTest.mouseMove(strand, place(strand, 2.12, 0.21))
    QTest.mouseMove(strand, place(strand, 5.0, 0.151))
    QTest.mouseRelease(strand, LEFT, PLAIN, place(strand, 5.0, 0.151))
    # Targets snap to twentieths of stroke.
    assert [one[1] for one in named(said, "target_dragged")] == pytest.approx([0.21, 0.15])
    assert named(said, "time_dragged") == []


def test_no_target_leaves_the_stroke(strand, said):
    QTest.mousePress(strand, LEFT, PLAIN, place(strand, 2.1, 0.3))
    QTest.mouseMove(strand, place(strand, 2.1, 0.2))
    QTest.mouseMove(strand, place(strand, 2.1, 0.2) + QPoint(0, 500))
    assert named(said, "target_dragged")[-1][1] == 0.0


def test_with_alt_a_target_goes_off_the_grid(strand, said):
    QTest.mousePress(strand, LEFT, PLAIN, place(strand, 2.1, 0.3))
    at = QPointF(place(strand, 2.1, 0.137))
    QApplication.sendEvent(strand, QMouseEvent(QEvent.Type.MouseMove, at, strand.mapToGlobal(at), LEFT, LEFT, ALT))
    ((segment, strain, free),) = named(said, "target_dragged")
    assert (segment, free) == (4, True)
    assert strain == pytest.approx(0.137, abs=0.003)


def test_a_knot_that_is_not_moved_was_clicked(strand, said):
    QTest.mouseClick(strand, LEFT, PLAIN, place(strand, 2.1, 0.3))
    assert named(said, "knot_clicked") == [(4, pytest.approx(2.1))]
    assert named(said, "knot_dropped") == [(False,)]


def test_a_click_elsewhere_puts_the_head_there(strand, said):
    QTest.mouseClick(strand, LEFT, PLAIN, place(strand, 6.0, 0.1))
    assert named(said, "head_moved") == [(pytest.approx(6.0, abs=0.02),)]


def test_by_keys_a_knot_is_found_held_moved_and_let_go(strand, said):
    key(strand, Qt.Key.Key_Tab)
    assert "knot 1 at 1:3.1" in strand.accessibleDescription()
    assert "120.0 mm" in strand.accessibleDescription()
    key(strand, Qt.Key.Key_Return)
    assert strand.holds
    key(strand, Qt.Key.Key_Down)
    key(strand, Qt.Key.Key_Down, ALT)
    key(strand, Qt.Key.Key_Right)
    key(strand, Qt.Key.Key_Return)
    assert [(one[1], one[2]) for one in named(said, "target_dragged")] == [
        (pytest.approx(0.285), False), (pytest.approx(0.2847), True),
    ]  # fmt: skip
    # One number is changed at a time: what has set out upright does not go sideways.
    assert named(said, "time_dragged") == []
    assert named(said, "knot_dropped") == [(True,)]


def test_escape_puts_a_held_knot_back(strand, said):
    key(strand, Qt.Key.Key_Tab)
    key(strand, Qt.Key.Key_Return)
    key(strand, Qt.Key.Key_Right)
    key(strand, Qt.Key.Key_Escape)
    assert named(said, "time_dragged")[-1] == (4, pytest.approx(2.1), True)
    assert named(said, "knot_dropped") == [(False,)]


def test_tab_goes_on_to_the_next_widget_after_the_last_knot(qtbot, make_weave):
    window = QWidget()
    qtbot.addWidget(window)
    column = QVBoxLayout(window)
    view, after = StrandView(), QLineEdit()
    column.addWidget(view)
    column.addWidget(after)
    view.set_strand(make_weave(), 0)
    window.show()
    view.setFocus()
    key(view, Qt.Key.Key_Tab)
    assert window.focusWidget() is view
    key(view, Qt.Key.Key_Tab)
    assert window.focusWidget() is after


def test_seconds_lie_in_the_columns_of_a_cloth_of_the_same_width(qtbot, strand, make_weave):
    cloth = ClothView()
    qtbot.addWidget(cloth)
    cloth.resize(1000, 600)
    cloth.set_weave(make_weave(until_s=2.1))
    for at in (0.0, 3.3, 8.0):
        assert float(strand._face().x_of(at)) == pytest.approx(cloth._current().x_of(at), abs=0.6)


def test_what_is_written_retimed_and_simulated_are_three_curves(strand, make_weave):
    weave = make_weave(until_s=2.1)
    later = weave.tracks.time_s.copy()
    later[4:6] += (0.0, 1.0)
    times = np.linspace(0.0, 8.0, 200)
    strand.set_strand(weave, 1, replace(weave.tracks, time_s=later), (times, 0.2 * np.clip(times - 3.0, 0.0, 1.0)))
    drawn = {tuple(one) for one in pixels(strand).reshape(-1, 3).tolist()}
    assert {DARK.written, DARK.retimed, DARK.simulated} <= drawn


def test_a_snag_is_hatched_and_told_in_words(strand):
    drawn = pixels(strand).mean(axis=2)
    face = strand._face()
    foot = drawn[int(face.box.bottom()) - 8 : int(face.box.bottom()) - 1, int(face.x_of(2.0)) : int(face.x_of(2.1))]
    assert foot.max() > 200
    assert foot.min() < 25
    assert "needs 1200 mm/s" in strand.accessibleDescription()


def test_percent_of_stroke_is_another_scale_for_the_same_curve(strand):
    before = strand._face()
    strand.set_percent(True)
    after = strand._face()
    assert (before.unit, after.unit) == ("mm", "%")
    assert 0.3 * after.per_strain == pytest.approx(100.0)
    assert float(before.y_of(0.1)) == float(after.y_of(0.1))


def test_a_held_knot_stays_in_the_hand_when_the_score_is_drawn_anew(strand, make_weave):
    key(strand, Qt.Key.Key_Tab)
    key(strand, Qt.Key.Key_Return)
    strand.set_strand(make_weave(until_s=2.3), 1)
    assert strand.holds
    strand.set_strand(make_weave(until_s=2.3), 2)
    assert not strand.holds


def test_without_a_fiber_it_says_what_to_do(strand):
    strand.set_strand(None, None)
    assert strand.accessibleDescription().startswith("Click a thread")
    assert not strand.grab().isNull()
    key(strand, Qt.Key.Key_Right)


def test_grids_may_be_anything_above_nothing(strand):
    with pytest.raises(ValueError, match="more than 0"):
        strand.set_grid(1.0, 0.0)


def test_light_is_light(strand):
    strand.set_theme(LIGHT)
    assert pixels(strand).mean() > 180


@pytest.mark.parametrize("size", [(320, 120), (1280, 240), (3840, 500)])
def test_any_size_can_be_drawn(strand, size):
    strand.resize(*size)
    assert strand.grab().width() == size[0]


def test_the_sheet_of_keys_names_every_key_once():
    names = [name for name, _ in KEYS]
    assert len(set(names)) == len(names)


def test_a_strand_can_be_shown_as_far_as_what_lies_beside_it_reaches(strand):
    whole = strand._weave.to_s
    strand.show_stretch(0.0, whole + 5.0)
    assert strand.shown == (0.0, whole)
    strand.reach(whole + 5.0)
    strand.show_stretch(0.0, whole + 5.0)
    assert strand.shown == (0.0, whole + 5.0)
    strand.reach(0.0)
    assert strand.shown == (0.0, whole)
