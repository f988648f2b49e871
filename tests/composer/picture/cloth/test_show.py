"""The living cloth as it is drawn."""

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtTest import QTest

from composer.picture.cloth import over
from composer.picture.cloth.cloth_view import ClothView
from composer.picture.palette import DARK, LIGHT
from composer.picture.scene import Stretch

from .gestures import LEFT, PLAIN, key, named, pixels, place


def test_following_the_head_turns_the_page(cloth):
    cloth.show_stretch(0.0, 2.0)
    cloth.set_head(2.5, follow=True)
    assert cloth.shown == (pytest.approx(2.4), pytest.approx(4.4))


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
    assert view.accessibleDescription().startswith("Nothing to show yet")
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
