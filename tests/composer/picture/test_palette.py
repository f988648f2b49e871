"""Colours and their contrast."""

from itertools import combinations

import numpy as np
import pytest

from composer.picture import palette
from composer.picture.palette import PAPER

THEMES = {**palette.THEMES, PAPER.name: PAPER}


def pairs(table):
    return [
        pytest.param(getattr(theme, name), getattr(theme, behind), id=f"{theme.name} {name} on {behind}")
        for theme in THEMES.values()
        for name, grounds in table
        for behind in grounds
    ]


def linear(colour):
    share = np.asarray(colour, float) / 255.0
    return np.where(share <= 0.04045, share / 12.92, ((share + 0.055) / 1.055) ** 2.4)


def lab(linear_rgb, outside):
    """CIE 1976 L*a*b* of linear sRGB."""
    given = outside["lab"]
    xyz = np.asarray(linear_rgb) @ np.array(given["srgb_to_xyz"]).T / np.array(given["white"])
    root = np.where(xyz > (6 / 29) ** 3, np.cbrt(xyz), xyz / (3 * (6 / 29) ** 2) + 4 / 29)
    return np.stack(
        [116 * root[..., 1] - 16, 500 * (root[..., 0] - root[..., 1]), 200 * (root[..., 1] - root[..., 2])], axis=-1
    )


def seen(colour, kind, outside):
    """Linear sRGB as somebody of that vision sees it."""
    here = linear(colour)
    if kind == "normal":
        return here
    given = outside["colour_blind"]
    if kind != "tritan":
        return np.clip(here @ np.array(given[kind]).T, 0.0, 1.0)
    first = (here @ np.array(given["tritan_normal"]) >= 0.0)[..., None]
    return np.clip(np.where(first, here @ np.array(given["tritan_1"]).T, here @ np.array(given["tritan_2"]).T), 0.0, 1.0)


VISIONS = ("normal", "protan", "deutan", "tritan")


def test_black_on_white_has_the_greatest_contrast_there_is(outside):
    assert palette.contrast((0, 0, 0), (255, 255, 255)) == pytest.approx(outside["contrast"]["black_on_white"])


@pytest.mark.parametrize(("ink", "ground"), pairs(palette.TEXT_ON))
def test_what_is_read_has_a_contrast_of_four_and_a_half(ink, ground, outside):
    assert palette.contrast(ink, ground) >= outside["contrast"]["text"]


@pytest.mark.parametrize(("mark", "ground"), pairs(palette.MARKS_ON))
def test_what_is_seen_as_a_mark_has_a_contrast_of_three(mark, ground, outside):
    assert palette.contrast(mark, ground) >= outside["contrast"]["mark"]


@pytest.mark.parametrize("theme", THEMES.values(), ids=THEMES)
@pytest.mark.parametrize("way", ["contract", "extend"])
def test_a_thread_stands_out_from_the_ground_at_rest_and_ever_more_up_to_full_stroke(theme, way):
    ramp = getattr(theme, way)
    apart = palette.contrast(ramp, theme.ground)
    assert apart[0] > 1.15
    assert np.all(np.diff(apart[::4]) > 0.0)
    assert palette.contrast(ramp[-1], ramp[0]) > 7.0


@pytest.mark.parametrize("theme", THEMES.values(), ids=THEMES)
def test_white_beside_black_of_the_hatch_is_seen_over_every_colour_of_a_thread(theme, outside):
    ramps = np.concatenate([theme.contract, theme.extend])
    best = np.maximum(palette.contrast(theme.hatch_light, ramps), palette.contrast(theme.hatch_dark, ramps))
    assert best.min() >= outside["contrast"]["mark"]


@pytest.mark.parametrize("theme", THEMES.values(), ids=THEMES)
@pytest.mark.parametrize("vision", VISIONS)
def test_both_hues_of_threads_stay_apart_for_every_kind_of_colour_vision(theme, vision, outside):
    half_way = slice(80, 176)
    one, other = (lab(seen(ramp[half_way], vision, outside), outside) for ramp in (theme.contract, theme.extend))
    assert np.linalg.norm(one - other, axis=-1).min() >= outside["lab"]["told_apart"]


@pytest.mark.parametrize("theme", THEMES.values(), ids=THEMES)
@pytest.mark.parametrize("vision", VISIONS)
@pytest.mark.parametrize(("one", "other"), [pair for group in palette.APART for pair in combinations(group, 2)])
def test_colours_shown_together_stay_apart_for_every_kind_of_colour_vision(theme, vision, one, other, outside):
    first, second = (lab(seen(getattr(theme, name), vision, outside), outside) for name in (one, other))
    assert np.linalg.norm(first - second) >= outside["lab"]["told_apart"]


def test_the_two_hues_are_alike_in_lightness_so_that_only_stroke_tells_brightness():
    for theme in THEMES.values():
        assert palette.luminance(theme.contract) == pytest.approx(palette.luminance(theme.extend), abs=0.06)


def test_white_is_white_in_lab(outside):
    assert lab(np.ones(3), outside) == pytest.approx([100.0, 0.0, 0.0], abs=0.02)


def test_grey_stays_grey_to_every_kind_of_colour_vision(outside):
    for vision in VISIONS:
        assert seen((128, 128, 128), vision, outside) == pytest.approx(linear((128, 128, 128)), abs=0.005)


def test_grey_comes_out_grey_from_oklch():
    assert palette.from_oklch([0.0, 1.0], 0.0, 0.0).tolist() == [[0, 0, 0], [255, 255, 255]]
