"""Threads worked out piece by piece."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.picture import image
from composer.picture.bands import Band
from composer.picture.cloth.sampling import Sampler, Source, differing, rendered, sampler_of, split
from composer.picture.palette import DARK


@pytest.fixture(scope="module")
def piece(make_piece):
    return make_piece(count=40)


def whole(steps):
    *_, last = steps
    return last


def source(piece, **more):
    return Source(Sampler(piece.tracks, piece.abilities), image.extends(piece.abilities), **more)


def test_scattered_fibers_are_where_all_of_them_are(piece):
    times = np.linspace(-1.0, 12.0, 200)
    fibers = np.array([0, 7, 39])
    every = image.shares(piece.tracks, piece.abilities, times)
    assert Sampler(piece.tracks, piece.abilities).shares(fibers, times) == pytest.approx(every[fibers])


@given(top=st.integers(0, 300), height=st.integers(1, 200))
def test_any_part_of_the_picture_is_that_part_of_the_whole(piece, top, height):
    rows = image.rows_of((Band("a", 0, 13), Band("b", 13, 40)), 400)
    times = np.linspace(0.0, 8.0, 50)
    full = image.threads(image.shares(piece.tracks, piece.abilities, times), image.extends(piece.abilities), rows)
    height = min(height, rows.height - top)
    part = whole(rendered(source(piece), rows, top, height, times, DARK, False))
    assert np.array_equal(part, full[top : top + height])


def test_threads_too_many_for_their_pixels_are_the_same_in_parts_as_in_one(piece):
    rows = image.rows_of((Band("a", 0, 40),), 16)
    times = np.linspace(0.0, 8.0, 50)
    assert rows.crowded
    full = image.threads(image.shares(piece.tracks, piece.abilities, times), image.extends(piece.abilities), rows)
    parts = [whole(rendered(source(piece), rows, top, 8, times, DARK, False)) for top in (0, 8)]
    assert np.array_equal(np.concatenate(parts), full)


def test_a_coarse_picture_shows_a_thread_of_each_row(piece):
    rows = image.rows_of((Band("a", 0, 40),), 16)
    times = np.linspace(0.0, 8.0, 50)
    coarse = whole(rendered(source(piece), rows, 0, 16, times, DARK, True))
    fine = whole(rendered(source(piece), rows, 0, 16, times, DARK, False))
    # All threads of this piece move alike, so that one stands for the mean.
    assert np.array_equal(coarse, fine)


def test_what_would_be_lies_below_what_is_and_only_where_it_differs(piece):
    later = piece.tracks.time_s.copy()
    later[1:3] += 1.0
    other = replace(piece.tracks, time_s=later)
    differs = differing(piece.tracks, other)
    assert differs.tolist() == [True] + [False] * 39
    rows = image.rows_of((Band("a", 0, 40),), 40 * 12)
    times = np.array([3.0])
    ghost = Source(sampler_of(piece.tracks, piece.abilities), image.extends(piece.abilities),
                   sampler_of(other, piece.abilities), differs)  # fmt: skip
    drawn = whole(rendered(ghost, rows, 0, rows.height, times, DARK, False))[:, 0]
    tall = int(rows.bottom[0] - rows.top[0])
    below, foot = split(tall)
    shares = [image.shares(tracks, piece.abilities, times)[:1] for tracks in (piece.tracks, other)]
    is_now, would_be = (image.colours(share, np.array([False]))[0, 0] for share in shares)
    edge = tall // 4 // 2
    assert drawn[edge].tolist() == is_now.tolist()
    assert drawn[below - 1].tolist() == list(DARK.ground)
    assert all(row.tolist() == would_be.tolist() for row in drawn[below:foot])
    assert drawn[int(rows.top[1]) + below].tolist() == is_now.tolist()


@given(tall=st.integers(7, 200))
def test_both_halves_of_a_split_thread_have_room(tall):
    below, foot = split(tall)
    edge = tall // 4 // 2
    assert below - 1 - edge >= 2
    assert foot - below >= 1


def test_a_fiber_with_more_knots_differs(piece, make_piece):
    more = make_piece(count=40)
    tracks = more.tracks
    first = tracks.first.copy()
    first[1:] += 1
    extra = {
        name: np.insert(getattr(tracks, name), 3, getattr(tracks, name)[2], axis=0)
        for name in ("time_s", "curve", "manner", "shape", "line", "phrase_line")
    }
    assert differing(piece.tracks, replace(tracks, first=first, **extra)).tolist() == [True] + [False] * 39
