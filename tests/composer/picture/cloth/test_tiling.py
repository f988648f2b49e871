"""The threads' image as tiles."""

import numpy as np
import pytest
from PySide6.QtGui import QImage

from composer.picture import image
from composer.picture.bands import Band
from composer.picture.cloth import tiling
from composer.picture.cloth.sampling import Source, sampler_of
from composer.picture.cloth.tiling import Tiles
from composer.picture.cloth.view import laid_out
from composer.picture.image import rows_of
from composer.picture.look import Look, painting
from composer.picture.palette import DARK, LIGHT


def view_of(count, from_s=0.0, to_s=8.0, height=600, zoom=1.0):
    bands = (Band("a", 0, count),)
    rows = {}

    def rows_in(high, widest):
        return rows.setdefault((high, widest), rows_of(bands, high, widest))

    return laid_out(Look(1.0), 900, height, rows_in, 0, zoom, 0.0, from_s, to_s)


def painted(tiles, view, budget=10_000):
    drawn = QImage(view.plan.width, view.shown, QImage.Format.Format_RGB32)
    drawn.fill(0)
    with painting(drawn) as painter:
        whole = tiles.paint(painter, view, budget)
    held = np.frombuffer(drawn.constBits(), np.uint8).reshape(view.shown, view.plan.width, 4)
    return held[:, :, 2::-1].copy(), whole


@pytest.fixture
def known(make_piece):
    piece = make_piece(count=30)
    return piece, Source(sampler_of(piece.tracks, piece.abilities), image.extends(piece.abilities))


@pytest.mark.parametrize(("from_s", "to_s"), [(0.0, 8.0), (1.7, 5.1), (2.9, 3.0)])
def test_tiles_show_the_strain_within_a_pixel_of_where_it_is(qapp, known, from_s, to_s):
    piece, source = known
    view = view_of(30, from_s, to_s)
    tiles = Tiles()
    tiles.use(source, view.rows, DARK)
    drawn, whole = painted(tiles, view)
    assert whole
    times = image.column_times(from_s, to_s, view.plan.width)
    share = image.shares(piece.tracks, piece.abilities, times)[0]
    row = int(view.rows.top[0] + view.rows.bottom[0]) // 2
    shade = {tuple(colour): step for step, colour in enumerate(DARK.contract.tolist())}
    seen = np.array([shade[tuple(pixel)] for pixel in drawn[row].tolist()]) / 255.0
    least = np.minimum.reduce([np.roll(share, by) for by in (-2, -1, 0, 1, 2)])
    most = np.maximum.reduce([np.roll(share, by) for by in (-2, -1, 0, 1, 2)])
    inner = slice(3, -3)
    assert np.all(seen[inner] >= least[inner] - 0.01)
    assert np.all(seen[inner] <= most[inner] + 0.01)


def test_what_is_there_is_not_worked_out_again(qapp, known, monkeypatch):
    _, source = known
    view = view_of(30)
    tiles = Tiles()
    tiles.use(source, view.rows, DARK)
    first, _ = painted(tiles, view)
    monkeypatch.setattr(tiling, "rendered", lambda *_: pytest.fail("worked out again"))
    again, whole = painted(tiles, view)
    assert whole
    assert np.array_equal(first, again)


def test_another_theme_is_another_picture(qapp, known):
    _, source = known
    view = view_of(30)
    tiles = Tiles()
    tiles.use(source, view.rows, DARK)
    dark, _ = painted(tiles, view)
    tiles.use(source, view.rows, LIGHT)
    light, _ = painted(tiles, view)
    assert dark.mean() < light.mean()


def test_without_time_nothing_is_worked_out_and_later_all_of_it_is(qtbot, make_piece):
    piece = make_piece(count=600)
    source = Source(sampler_of(piece.tracks, piece.abilities), image.extends(piece.abilities))
    view = view_of(600)
    tiles = Tiles()
    tiles.use(source, view.rows, DARK)
    _, whole = painted(tiles, view, 0)
    assert not whole
    with qtbot.waitSignal(tiles.settled, timeout=20_000):
        pass
    later, whole = painted(tiles, view, 0)
    assert whole
    assert later.any(axis=2).all()


def test_crowded_threads_are_shown_coarsely_before_they_are_shown_well(qapp, make_piece, monkeypatch):
    piece = make_piece(count=2000)
    source = Source(sampler_of(piece.tracks, piece.abilities), image.extends(piece.abilities))
    view = view_of(2000)
    asked = []
    real = tiling.rendered
    monkeypatch.setattr(tiling, "rendered", lambda *how: asked.append(how[-1]) or real(*how))
    tiles = Tiles()
    tiles.use(source, view.rows, DARK)
    painted(tiles, view)
    assert asked == sorted(asked, reverse=True)
    assert asked.count(True) == asked.count(False) > 0


def test_tiles_stay_within_their_room(qapp, known, monkeypatch):
    _, source = known
    monkeypatch.setattr(tiling, "MOST_BYTES", 2_000_000)
    tiles = Tiles()
    rows = view_of(30).rows
    for begin in np.arange(0.0, 6.0, 0.5):
        view = view_of(30, begin, begin + 0.6)
        tiles.use(source, rows, DARK)
        painted(tiles, view)
        assert tiles.held_bytes <= 2_000_000
