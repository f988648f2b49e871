"""The picture of a fit: data, curve and frame are there."""

import numpy as np
import pytest

from composer.fit.fitted import Fitted
from composer.picture import png
from composer.picture.plots import fit


@pytest.fixture(scope="module")
def picture():
    time = np.linspace(0.0, 10.0, 500)
    strain = 0.1 * (1.0 - np.cos(time))
    fitted = Fitted(
        "cord", "contractile", {}, (), {}, 0.0, 500, 500, time, 1e6 * strain, strain + 0.01, strain, 0.01, 0.2, (), ()
    )
    image = png.drawn(lambda painter: fit.paint(painter, fitted, "bench.csv"), fit.WIDTH, fit.HEIGHT)
    flat = np.frombuffer(image.constBits(), np.uint8).reshape(image.height(), image.bytesPerLine())
    return flat[:, : 4 * image.width()].reshape(image.height(), image.width(), 4)[:, :, 2::-1].astype(int)


def near(picture, colour):
    return (np.abs(picture - np.array(colour)).sum(axis=2) < 60).sum()


def test_the_picture_has_its_size(picture):
    assert picture.shape == (fit.HEIGHT, fit.WIDTH, 3)


def test_the_fitted_curve_and_the_measured_dots_are_both_seen(picture):
    assert near(picture, fit.MODELLED) > 2000
    assert near(picture, fit.MEASURED) > 300


def test_what_is_left_over_is_drawn_in_its_own_panel_only(picture):
    # The only purple there is: dots half see-through, so no exact colour.
    red, green, blue = np.moveaxis(picture, 2, 0)
    seen = (red > green + 15) & (blue > green + 15)
    assert seen[fit.HEIGHT * 2 // 3 :].sum() > 100 and seen[: fit.HEIGHT // 2].sum() < 20


def test_a_fit_without_any_swing_is_drawn_too():
    flat = np.zeros(60)
    fitted = Fitted("x", "rated", {}, (), {}, 0.0, 60, 60, np.arange(60.0), flat, flat, flat, 0.0, 0.1, (), ())
    assert png.png_bytes(png.drawn(lambda painter: fit.paint(painter, fitted, "b"), fit.WIDTH, fit.HEIGHT))
