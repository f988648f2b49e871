"""Ticks."""

import numpy as np
import pytest

from composer.picture.axes import bar_ticks, grid_lines, say_seconds, second_ticks, value_ticks
from composer.picture.bars import RetimedBars
from composer.score.tempo import TempoMap


def steady(rate=1.0, counts=4.0):
    """So many counts a second, so many in a bar."""
    zero = np.zeros(1)
    return TempoMap(zero, zero, np.array([rate]), zero, zero, zero, np.array([counts]))


def labelled(ticks):
    return [(tick.label, pytest.approx(tick.at)) for tick in ticks if tick.label and tick.strong]


def test_every_bar_is_labelled_where_there_is_room():
    assert labelled(bar_ticks(steady(), 0.0, 16.0, 800, 40, 8)) == [
        ("1", 0.0),
        ("2", 4.0),
        ("3", 8.0),
        ("4", 12.0),
        ("5", 16.0),
    ]


def test_where_bars_are_close_labels_go_by_two_four_eight_from_bar_one():
    assert labelled(bar_ticks(steady(), 0.0, 400.0, 1000, 40, 8))[:3] == [("1", 0.0), ("5", 16.0), ("9", 32.0)]


@pytest.mark.parametrize("length", [0.3, 7.0, 200.0, 3600.0, 1e6])
def test_labels_never_stand_closer_than_asked(length):
    at = [tick.at for tick in bar_ticks(steady(1.7, 3.0), 0.0, length, 1200, 40, 8) if tick.label and tick.strong]
    assert np.all(np.diff(at) * 1200 / length >= 40 - 1e-6)
    assert at


def test_counts_are_ticked_where_they_stand_far_enough_apart_and_not_where_they_do_not():
    wide = [tick.at for tick in bar_ticks(steady(), 0.0, 8.0, 800, 40, 8) if not tick.strong]
    assert wide == pytest.approx([1, 2, 3, 5, 6, 7])
    assert all(tick.strong for tick in bar_ticks(steady(), 0.0, 400.0, 800, 40, 8))


def test_a_view_from_the_middle_has_the_same_bars():
    assert labelled(bar_ticks(steady(), 9.0, 17.0, 800, 40, 8)) == [("4", 12.0), ("5", 16.0)]


def test_bars_of_a_retimed_score_stand_where_they_have_gone():
    bars = RetimedBars(steady(), np.array([0.0, 4.0, 8.0]), np.array([0.0, 4.0, 9.0]))
    assert labelled(bar_ticks(bars, 0.0, 13.0, 800, 40, 8)) == [("1", 0.0), ("2", 4.0), ("3", 9.0), ("4", 13.0)]
    assert bars.say_place(6.5) == "2:3"


def test_seconds_are_round_and_read_as_minutes_from_one_on():
    assert [tick.label for tick in second_ticks(0.0, 90.0, 300, 90)] == ["0 s", "30 s", "1:00", "1:30"]
    assert [tick.label for tick in second_ticks(1.0, 1.5, 300, 100)] == ["1.0 s", "1.2 s", "1.4 s"]


def test_times_are_said_in_seconds_then_minutes():
    assert [say_seconds(t, d) for t, d in ((12.34, 1), (59.0, 0), (60.0, 0), (185.25, 2))] == [
        "12.3 s",
        "59 s",
        "1:00",
        "3:05.25",
    ]


def test_values_are_round_and_no_more_than_asked():
    assert value_ticks(0.0, 110.0, 3).tolist() == [0.0, 50.0, 100.0]
    assert len(value_ticks(430.0, 815.0, 4)) <= 4
    assert value_ticks(1.0, 1.0, 4).tolist() == []


@pytest.mark.parametrize("length", [3.0, 40.0, 4000.0])
def test_lines_of_a_grid_are_drawn_as_far_apart_as_asked_and_stand_on_it(length):
    tempo = steady()
    lines = np.array(grid_lines(tempo, 0.25, 10.0, 10.0 + length, length / 700.0, 8.0))
    assert np.diff(lines).min() / (length / 700.0) >= 8.0 - 1e-9
    assert np.allclose(tempo.counts(lines) % 0.25, 0.0)
    assert lines[0] <= 10.0 and lines[-1] > 10.0 + length - np.diff(lines).max() - 1e-9
