import numpy as np
from PySide6.QtCore import QRectF

from composer.picture import palette
from composer.picture.look import Look, colour
from composer.picture.plots.plot import Axis, Curve, paint
from composer.picture.png import drawn

from .test_makes import pixels_of


def picture(*curves, right=None):
    box = QRectF(0, 0, 400, 300)

    def draw(painter):
        painter.fillRect(box, colour(palette.GROUND))
        paint(painter, Look(1.0), box, Axis(0.0, 10.0, "x"), Axis(0.0, 1.0, "y"), curves, right)

    return pixels_of(drawn(draw, 400, 300))


def where(pixels, of):
    return np.argwhere(np.all(pixels == np.array(of, np.uint8), axis=-1))


def test_a_level_curve_lies_at_its_value_across_the_whole_plot():
    pixels = picture(Curve(np.array([0.0, 10.0]), np.array([0.5, 0.5]), palette.DUTY))
    rows, columns = where(pixels, palette.DUTY).T
    # The plot reaches from 22 to 264 pixels down and 52 to 388 across.
    assert abs(rows.mean() - (22 + 264) / 2) < 2
    assert columns.min() <= 53
    assert columns.max() >= 386


def test_a_dashed_curve_has_gaps():
    whole, dashed = (
        len(where(picture(Curve(np.array([0.0, 10.0]), np.array([0.5, 0.5]), palette.DUTY, dashed=dash)), palette.DUTY))
        for dash in (False, True)
    )
    assert 0.4 * whole < dashed < 0.8 * whole


def test_nothing_is_drawn_beyond_the_axes():
    pixels = picture(Curve(np.array([0.0, 10.0]), np.array([2.0, 2.0]), palette.DUTY))
    assert len(where(pixels, palette.DUTY)) == 0


def test_an_arrow_stands_at_its_point():
    line = np.linspace(0.0, 10.0, 101), np.full(101, 0.5)
    plain, arrowed = (where(picture(Curve(*line, palette.DUTY, arrows=arrows)), palette.DUTY) for arrows in ((), (50,)))
    more = {tuple(at) for at in arrowed} - {tuple(at) for at in plain}
    assert more
    assert all(205 < column < 223 for _, column in more)


def test_a_second_scale_makes_room_on_the_right():
    pixels = picture(Curve(np.array([0.0, 10.0]), np.array([0.5, 0.5]), palette.DUTY), right=Axis(0.0, 400.0, "mm/s"))
    assert where(pixels, palette.DUTY)[:, 1].max() < 350
