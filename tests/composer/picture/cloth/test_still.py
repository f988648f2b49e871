"""The cloth, drawn without a screen."""

from dataclasses import replace

import numpy as np
import pytest

from composer.picture import image, palette, png
from composer.picture.cloth import still as cloth


def pixels(scene, width=1280, height=800):
    """The picture as (height, width, 3)."""
    drawn = png.drawn(lambda painter: cloth.paint(painter, scene, width, height), width, height)
    flat = np.frombuffer(drawn.constBits(), np.uint8).reshape(height, drawn.bytesPerLine() // 4, 4)
    return flat[:, :width, 2::-1].copy()


def test_the_picture_has_the_size_asked_for_and_is_a_png(make_scene, outside):
    scene = make_scene()
    for width, height in ((640, 400), (1280, 800), (3840, 2160)):
        data = png.png_bytes(png.drawn(lambda painter, w=width, h=height: cloth.paint(painter, scene, w, h), width, height))
        assert list(data[:8]) == outside["png"]["signature"]
        assert (int.from_bytes(data[16:20]), int.from_bytes(data[20:24])) == (width, height)


def test_a_thread_has_the_colour_of_its_strain_at_its_time(make_scene):
    plan = cloth.layout(1280, 800, 3)
    scene = make_scene(columns=plan.width)
    rows = image.rows_of(scene.bands, plan.room)
    drawn = pixels(scene)
    y = plan.top + int((rows.top[1] + rows.bottom[1]) / 2)
    for at, step in ((1.0, 0), (7.0, 255)):
        x = plan.left + int(at / 8.0 * plan.width)
        assert drawn[y, x].tolist() == palette.CONTRACT[step].tolist()


def test_a_snag_is_hatched_light_and_dark_whatever_the_threads_colour(make_scene):
    plan = cloth.layout(1280, 800, 3)
    for_rig = make_scene(columns=plan.width)
    snagged = make_scene(columns=plan.width, until_s=2.4)
    assert not for_rig.snags
    assert snagged.snags
    rows = image.rows_of(snagged.bands, plan.room)
    top, bottom = plan.top + int(rows.top[0]), plan.top + int(rows.bottom[0])
    begin, end = (round(cloth.x_of(plan, snagged, at)) for at in (2.1, 2.3))
    hatched = palette.luminance(pixels(snagged)[top:bottom, begin:end])
    plain = palette.luminance(pixels(for_rig)[top:bottom, begin:end])
    assert hatched.max() > 0.95
    assert hatched.min() < 0.001
    assert plain.max() < 0.5


def test_the_shortest_snag_is_wide_enough_to_be_seen(make_scene):
    scene = make_scene(until_s=2.4)
    plan = cloth.layout(1280, 800, 3)
    first = min(scene.snags, key=lambda snag: snag.from_s)
    instant = type(first)(first.fiber, 5.0, 5.0)
    strip = pixels(replace(scene, snags=(instant,)))[plan.strip_top + 4]
    marked = np.flatnonzero((strip == palette.LIMIT).all(axis=1))
    assert len(marked) >= cloth.LEAST_MARK
    assert marked.mean() == pytest.approx(cloth.x_of(plan, scene, 5.0), abs=1.0)


def test_pins_and_cues_stand_at_their_instants(make_scene):
    scene = make_scene()
    plan = cloth.layout(1280, 800, 3)
    drawn = pixels(scene)
    pin = drawn[plan.cues_top + 24]
    heads = np.flatnonzero((pin == palette.PIN).all(axis=1))
    assert heads.mean() == pytest.approx(cloth.x_of(plan, scene, 4.0), abs=1.0)
    pennants = drawn[plan.cues_top + 6]
    green = np.flatnonzero((pennants == palette.CUE).all(axis=1))
    assert abs(green.min() - cloth.x_of(plan, scene, 2.0)) <= 2


@pytest.mark.parametrize("count", [1, 12, 700, 2000])
def test_any_number_of_fibers_fits_the_picture(make_scene, count):
    scene = make_scene(columns=50, count=count)
    drawn = pixels(scene, 640, 400)
    assert len(np.unique(drawn.reshape(-1, 3), axis=0)) > 10
    # The ground's colour all along the edges: nothing runs out of the picture.
    assert np.all(drawn[0] == palette.GROUND)
    assert np.all(drawn[-1] == palette.GROUND)
