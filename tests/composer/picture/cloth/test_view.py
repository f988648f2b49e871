"""Where a window has everything."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.picture.bands import Band
from composer.picture.cloth.view import laid_out, level_of, most_zoom
from composer.picture.image import rows_of
from composer.picture.look import Look

BANDS = (Band("a", 0, 20), Band("b", 20, 48))


def view(width=1280, height=800, zoom=1.0, place=0.0, from_s=10.0, to_s=50.0, scale=1.0, lanes=2):
    return laid_out(
        Look(scale), width, height, lambda high, widest: rows_of(BANDS, high, widest), lanes, zoom, place, from_s, to_s
    )


@given(at=st.floats(10.0, 50.0))
def test_an_instant_comes_back_from_its_column(at):
    assert view().s_of(view().x_of(at)) == pytest.approx(at)


@given(fiber=st.integers(0, 47), zoom=st.floats(1.0, 8.0), place=st.floats(0.0, 1.0))
def test_a_thread_is_found_at_its_middle_wherever_it_is_shown(fiber, zoom, place):
    here = view(zoom=zoom, place=place)
    middle = sum(here.y_of(fiber)) / 2
    found = here.fiber_at(middle)
    shown = here.plan.top <= middle < here.plan.top + here.plan.room
    assert found == (fiber if shown else None)
    assert fiber in here.fibers_shown() or not shown


@pytest.mark.parametrize(
    ("width", "height", "scale"), [(1280, 800, 1.0), (3840, 2160, 1.0), (3840, 2160, 2.0), (500, 300, 1.0)]
)
def test_threads_lanes_and_axis_share_the_height_without_overlap(width, height, scale):
    here = view(width, height, scale=scale)
    assert here.plan.cues_top < here.plan.bars_top < here.plan.strip_top < here.plan.top
    assert here.plan.top + here.shown <= here.lanes_top
    assert here.lanes_top + here.lanes_height <= height - here.look.px(20)
    assert here.plan.left + here.plan.width <= width


def test_a_cloth_without_room_for_lanes_has_none():
    assert view(800, 240).lanes_height == 0


def test_zoomed_in_as_far_as_it_goes_a_thread_is_fat():
    here = view(zoom=most_zoom(Look(1.0), view().plan.room, 48))
    assert here.rows.bottom[0] - here.rows.top[0] >= 60


def test_no_scroll_goes_past_the_last_thread():
    here = view(zoom=4.0, place=1.0)
    assert here.scroll == here.rows.height - here.plan.room


@given(per_px=st.floats(1e-6, 1e4))
def test_a_column_of_a_tile_is_a_pixel_at_most_and_more_than_half_of_one(per_px):
    assert 0.5 * per_px < 2.0 ** level_of(per_px) <= per_px
