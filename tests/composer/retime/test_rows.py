"""The rows of the programme, each on a score that shows it alone."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.retime.events import events_of, with_waits
from composer.retime.rows import (
    HOLD_ROW,
    MOVE_ROW,
    ORDER_ROW,
    Sums,
    differences,
    duration_rows,
    joined,
    no_rows,
    order_rows,
    picked,
    pin_rows,
    sum_rows,
)  # fmt: skip
from composer.retime.stage import durations_to_keep

from .scores import tracks_of

TRACK = [(0.0, None, "hold"), (1.0, 0.3, "linear"), (1.25, None, "hold"), (3.0, 0.0, "linear"), (5.0, None, "end")]


@pytest.fixture
def built(make_rig):
    abilities = abilities_of(make_rig(1))
    tracks, _ = with_waits(tracks_of([TRACK]))
    least = durations_to_keep(tracks, abilities)
    return tracks, events_of(tracks, abilities, least), least


def test_a_move_lacks_what_its_least_duration_exceeds_what_it_has(built):
    tracks, events, least = built
    rows = duration_rows(tracks, events, least)
    moves = rows.kind == MOVE_ROW
    assert rows.knot[moves].tolist() == [1, 3]
    assert rows.least[moves] == pytest.approx([0.25, 1.0 - 2.0])


def test_a_hold_may_shrink_to_nothing(built):
    tracks, events, least = built
    rows = duration_rows(tracks, events, least)
    assert rows.least[rows.kind == HOLD_ROW] == pytest.approx([-1.0, -1.75])


def test_a_move_that_the_checker_lets_pass_lacks_nothing(make_rig):
    abilities = abilities_of(make_rig(1))
    tracks, _ = with_waits(tracks_of([[(0.0, 0.3, "linear"), (0.5 * (1.0 - 2e-7), None, "end")]]))
    least = durations_to_keep(tracks, abilities)
    assert duration_rows(tracks, events_of(tracks, abilities, least), least).least.tolist() == [0.0]


def test_hits_keep_their_order_from_the_start_on(built):
    _, events, _ = built
    rows = order_rows(events)
    assert rows.kind.tolist() == [ORDER_ROW] * 2
    assert rows.least == pytest.approx([-1.25, -3.75])
    assert len(rows.short(np.array([-2.0, 0.0, 0.0, 0.0]))) == 1


@pytest.mark.parametrize(
    ("pin", "give", "shift", "kept"),
    [
        (1.25, 0.0, [0.0, 0.5], True),
        (1.25, 0.0, [0.1, 0.0], False),
        (1.25, 0.0, [-0.1, 0.0], False),
        (1.25, 0.1, [0.1, 0.0], True),
        (1.25, 0.1, [0.2, 0.0], False),
        (2.0, 0.0, [0.75, 0.0], True),
        (2.0, 0.0, [0.8, 0.0], False),
        (2.0, 0.0, [0.0, -3.1], False),
        (2.0, 0.2, [0.8, 0.0], True),
    ],
)
def test_a_pin_holds_its_hit_or_keeps_those_around_on_their_sides(built, pin, give, shift, kept):
    _, events, _ = built
    rows = pin_rows(events, np.array([pin]), np.array([give]))
    assert (len(rows.short(np.array([*shift, 0.0, 0.0]))) == 0) == kept


def test_a_sum_row_is_the_sum_of_what_its_segments_last(built):
    tracks, events, _ = built
    # Half of the first move, the hold, and a quarter of the second: 0.125 + 1.75 + 0.5 s as written.
    sums = Sums(np.zeros(3, dtype=np.int64), np.array([1, 2, 3]), np.array([0.5, 1.0, 0.25]), np.array([2.0]))
    rows = sum_rows(tracks, events, sums, 4, np.array([1]))
    assert rows.least == pytest.approx([0.375])
    shift = np.array([0.1, -0.2, 0.3, -0.4])
    times = {1: (1.0 + 0.3, 1.25 + 0.1), 2: (1.25 + 0.1, 3.0 - 0.4), 3: (3.0 - 0.4, 5.0 - 0.2)}
    total = sum(share * (times[k][1] - times[k][0]) for k, share in ((1, 0.5), (2, 1.0), (3, 0.25)))
    assert rows.matrix @ shift - rows.least == pytest.approx([2.0 - total])


def test_rows_can_be_joined_and_picked(built):
    _, events, _ = built
    rows = joined([order_rows(events), no_rows(events), differences(
        events, np.array([1]), np.array([-1]), np.array([0.5]), ORDER_ROW, np.array([7]))])  # fmt: skip
    assert len(rows.least) == 3
    last = picked(rows, np.array([2]))
    assert (last.least.tolist(), last.knot.tolist()) == ([0.5], [7])
