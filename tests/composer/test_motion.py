"""Strain and rate of tracks at any instant."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.motion import Cursor, rate_at, segments_at, strain_at
from composer.shapes import PROGRESS
from composer.tracks import HOLD, MOVE, STEP, SUDDEN, Tracks


def tracks_of(*fibers: list[tuple[float, float, int, str]]) -> Tracks:
    """Tracks from (start s, target, manner, shape) a segment for each fiber; each ends where the next begins."""
    first, times, curves, manners = [0], [], [], []
    for segments in fibers:
        at = 0.0
        for time, target, manner, shape in segments:
            times.append(time)
            manners.append(manner)
            curves.append(np.eye(6)[0] * at + (target - at) * PROGRESS[shape])
            at = target
        first.append(len(times))
    count = len(times)
    zeros = np.zeros(count, dtype=np.int32)
    return Tracks(
        np.array(first),
        np.array(times),
        np.array(curves),
        np.array(manners, np.int8),
        zeros.astype(np.int8),
        zeros,
        zeros,
        max(times),
    )


TWO = tracks_of(
    [(0.0, 0.3, MOVE, "smooth"), (1.0, 0.3, HOLD, "linear"), (1.5, 0.0, SUDDEN, "linear"), (2.5, 0.0, HOLD, "linear")],
    [(0.0, 0.0, HOLD, "linear"), (1.0, 0.2, STEP, "step"), (1.0, 0.1, MOVE, "settle"), (3.0, 0.1, HOLD, "linear")],
)


@pytest.fixture(scope="module")
def abilities(make_rig):
    return abilities_of(make_rig(2))


def test_at_a_knot_the_strain_is_the_knots_own_to_the_last_digit(abilities):
    for fiber in range(2):
        knots = slice(TWO.first[fiber], TWO.first[fiber + 1])
        landed = strain_at(TWO, abilities, TWO.time_s[knots])[fiber]
        alone = np.append(np.diff(TWO.time_s[knots]) > 0.0, True)  # of two knots at one instant the later counts
        assert landed[alone].tolist() == TWO.curve[knots, 0][alone].tolist()


def test_after_a_jump_the_strain_is_where_it_jumped_to(abilities):
    before, at = strain_at(TWO, abilities, [np.nextafter(1.0, 0.0), 1.0])[1]
    assert (before, at) == (0.0, 0.2)


def test_minimum_jerk_is_half_way_at_half_time_at_fifteen_eighths_of_its_mean_speed(abilities):
    assert strain_at(TWO, abilities, [0.5])[0, 0] == pytest.approx(0.15, abs=1e-15)
    assert rate_at(TWO, abilities, [0.5])[0, 0] == pytest.approx(0.3 * 15 / 8, rel=1e-14)  # Flash and Hogan 1985


def test_a_sudden_move_goes_as_fast_as_the_fiber_exhausts(abilities):
    assert strain_at(TWO, abilities, [1.75])[0, 0] == pytest.approx(0.3 - 0.3 * 0.25)
    assert rate_at(TWO, abilities, [1.75])[0, 0] == pytest.approx(-0.3)


def test_a_sudden_move_with_too_little_time_still_arrives_and_shows_the_rate_that_it_would_need(abilities):
    hurried = tracks_of([(0.0, 0.3, SUDDEN, "linear"), (0.25, 0.3, HOLD, "linear")], [(0.0, 0.0, HOLD, "linear")])
    assert strain_at(hurried, abilities, [0.125, 0.25])[0] == pytest.approx([0.15, 0.3])
    assert rate_at(hurried, abilities, [0.1])[0, 0] == pytest.approx(1.2)


def test_before_the_first_and_after_the_last_knot_fibers_stand_still(abilities):
    assert strain_at(TWO, abilities, [-5.0, 1e6]).tolist() == [[0.0, 0.0], [0.0, pytest.approx(0.1)]]
    assert not rate_at(TWO, abilities, [1e6]).any()


def test_times_of_each_fibers_own_give_what_each_alone_gives(abilities):
    own = np.array([[0.2, 1.7], [1.3, 2.9]])
    together = strain_at(TWO, abilities, own)
    assert together.tolist() == [strain_at(TWO, abilities, own[0])[0].tolist(), strain_at(TWO, abilities, own[1])[1].tolist()]


@st.composite
def any_tracks(draw: st.DrawFn) -> Tracks:
    """A few fibers with random moves, holds, jumps and sudden moves."""
    gap = st.sampled_from([0.0, 0.1, 0.25, 1.0])
    kind = st.sampled_from([(MOVE, "smooth"), (MOVE, "swell"), (SUDDEN, "linear"), (HOLD, "linear"), (STEP, "step")])
    fibers = []
    for _ in range(2):
        time, at, segments = 0.0, 0.0, []
        for _ in range(draw(st.integers(0, 12))):
            manner, shape = draw(kind)
            at = at if manner == HOLD else draw(st.floats(0.0, 0.3))
            segments.append((time, at, manner, shape))
            time += 0.0 if manner == STEP else draw(gap)
        fibers.append([*segments, (time, at, HOLD, "linear")])
    return tracks_of(*fibers)


@settings(deadline=None)
@given(
    tracks=any_tracks(),
    times=st.lists(st.floats(-1.0, 14.0) | st.sampled_from([0.0, 0.1, 0.25, 1.0, 1.25]), min_size=1, max_size=40),
)
def test_a_cursor_says_the_same_as_the_grid_in_whatever_order_it_is_asked(abilities, tracks, times):
    cursor = Cursor(tracks, abilities)
    strain, rate = strain_at(tracks, abilities, times), rate_at(tracks, abilities, times)
    for column, time in enumerate(times):
        now, speed = cursor.at(time)
        assert now == pytest.approx(strain[:, column], abs=1e-12)
        assert speed == pytest.approx(rate[:, column], abs=1e-9)


@settings(deadline=None)
@given(tracks=any_tracks(), times=st.lists(st.floats(-1.0, 14.0), min_size=8, max_size=20))
def test_both_ways_of_searching_find_the_last_segment_to_have_begun(tracks, times):
    many, few = segments_at(tracks, times), np.hstack([segments_at(tracks, [time]) for time in times])
    assert (many == few).all()
    for fiber in range(tracks.fibers):
        begins = tracks.time_s[tracks.first[fiber] : tracks.first[fiber + 1]]
        assert [tracks.first[fiber] + max(0, np.sum(begins <= time) - 1) for time in times] == many[fiber].tolist()


def test_the_rate_is_the_slope_of_the_strain(abilities):
    times = np.array([0.1, 0.4, 0.9, 1.6, 2.2, 2.8])
    slope = (strain_at(TWO, abilities, times + 1e-6) - strain_at(TWO, abilities, times - 1e-6)) / 2e-6
    assert rate_at(TWO, abilities, times) == pytest.approx(slope, abs=1e-6)
