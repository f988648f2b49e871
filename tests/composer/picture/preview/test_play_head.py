"""The play head's clock."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.picture.preview.play_head import (
    PlayHead,
    advanced,
    moved_to,
    started,
    stopped,
    with_loop,
    with_speed,
    without_loop,
)


def test_it_runs_at_its_speed_and_stops_at_the_end():
    head = started(PlayHead(10.0, 4.0, speed=0.5))
    assert advanced(head, 2.0).at_s == 5.0
    assert advanced(head, 2.0).playing
    ended = advanced(head, 100.0)
    assert (ended.at_s, ended.playing) == (10.0, False)


def test_standing_it_does_not_move():
    assert advanced(PlayHead(10.0, 4.0), 3.0).at_s == 4.0
    assert advanced(stopped(started(PlayHead(10.0, 4.0))), 3.0).at_s == 4.0


def test_from_the_end_it_starts_over_and_with_a_loop_from_the_loop():
    assert started(PlayHead(10.0, 10.0)).at_s == 0.0
    assert started(with_loop(PlayHead(10.0, 9.0), 2.0, 4.0)).at_s == 2.0
    assert started(with_loop(PlayHead(10.0, 3.0), 2.0, 4.0)).at_s == 3.0


@given(st.floats(0.0, 3.9), st.floats(0.01, 100.0), st.floats(0.25, 2.0))
def test_in_a_loop_it_goes_round_and_never_leaves_it(at, passed, speed):
    head = with_speed(with_loop(started(PlayHead(10.0, at)), 2.0, 4.0), speed)
    after = advanced(head, passed)
    assert after.playing
    assert after.at_s < 4.0
    whole = at + passed * speed
    if whole >= 4.0:
        assert (after.at_s - 2.0 - (whole - 4.0)) / 2.0 == pytest.approx(round((after.at_s - 2.0 - (whole - 4.0)) / 2.0))


def test_a_loop_may_be_named_from_its_end_and_lies_within_the_piece():
    assert with_loop(PlayHead(10.0), 8.0, 6.0).loop_s == (6.0, 8.0)
    assert with_loop(PlayHead(10.0), -3.0, 60.0).loop_s == (0.0, 10.0)


def test_a_passage_too_short_to_be_one_is_none():
    assert with_loop(PlayHead(10.0), 5.0, 5.01).loop_s is None
    assert without_loop(with_loop(PlayHead(10.0), 5.0, 6.0)).loop_s is None


def test_speed_stays_between_a_quarter_and_double():
    assert with_speed(PlayHead(1.0), 0.01).speed == 0.25
    assert with_speed(PlayHead(1.0), 9.0).speed == 2.0


def test_no_place_outside_the_piece_is_taken():
    assert moved_to(PlayHead(10.0), -4.0).at_s == 0.0
    assert moved_to(PlayHead(10.0), 40.0).at_s == 10.0


@given(st.lists(st.floats(0.0, 1.0), max_size=30))
def test_many_small_steps_come_as_far_as_one_large_one(steps):
    head = with_loop(started(PlayHead(10.0)), 3.0, 7.0)
    small = head
    for step in steps:
        small = advanced(small, step)
    assert (
        small.at_s == pytest.approx(advanced(head, sum(steps)).at_s, abs=1e-9)
        or abs(abs(small.at_s - advanced(head, sum(steps)).at_s) - 4.0) < 1e-6
    )
