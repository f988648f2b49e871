"""Colours and their contrast."""

import numpy as np
import pytest

from composer.picture import palette


def test_black_on_white_has_the_greatest_contrast_there_is(outside):
    assert palette.contrast((0, 0, 0), (255, 255, 255)) == pytest.approx(outside["contrast"]["black_on_white"])


@pytest.mark.parametrize(("name", "ink", "ground"), palette.TEXTS)
def test_what_is_read_has_a_contrast_of_four_and_a_half(name, ink, ground, outside):
    assert palette.contrast(ink, ground) >= outside["contrast"]["text"]


@pytest.mark.parametrize(("name", "mark", "ground"), palette.MARKS)
def test_what_is_seen_as_a_mark_has_a_contrast_of_three(name, mark, ground, outside):
    assert palette.contrast(mark, ground) >= outside["contrast"]["mark"]


@pytest.mark.parametrize("ramp", [palette.CONTRACT, palette.EXTEND])
def test_a_thread_grows_lighter_all_the_way_to_full_stroke(ramp):
    light = palette.luminance(ramp)
    assert np.all(np.diff(light[::4]) > 0.0)
    assert palette.contrast(ramp[-1], ramp[0]) > 7.0


@pytest.mark.parametrize("ramp", [palette.CONTRACT, palette.EXTEND])
def test_a_thread_at_rest_still_stands_out_from_the_ground(ramp):
    assert palette.contrast(ramp[0], palette.GROUND) > 1.15


@pytest.mark.parametrize("kind", ["protan", "deutan"])
def test_both_hues_stay_apart_for_colour_blind_people(kind, outside):
    both = np.array([palette.CONTRACT, palette.EXTEND])[:, 64:200] / 255.0
    linear = np.where(both <= 0.04045, both / 12.92, ((both + 0.055) / 1.055) ** 2.4)
    seen = np.clip(linear @ np.array(outside["colour_blind"][kind]).T, 0.0, 1.0)
    yellow_less_blue = seen[..., 0] - seen[..., 2]
    assert np.all(yellow_less_blue[0] > 0.02)
    assert np.all(yellow_less_blue[1] < -0.02)


def test_the_two_hues_are_alike_in_lightness_so_that_only_stroke_tells_brightness():
    assert palette.luminance(palette.CONTRACT) == pytest.approx(palette.luminance(palette.EXTEND), abs=0.06)


def test_grey_comes_out_grey_from_oklch():
    assert palette.from_oklch([0.0, 1.0], 0.0, 0.0).tolist() == [[0, 0, 0], [255, 255, 255]]
