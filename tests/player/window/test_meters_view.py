"""What the groups' meters, and the room of what comes next, show of a moment."""

import numpy as np
import pytest

from player.governor.causes import CAUSES
from player.window.count_in import CountIn
from player.window.meters_view import readings, rows_of
from player.window.next_view import Coming, as_shown


class Moment:
    """A moment of five fibers."""

    def __init__(self, state="playing", **changed):
        self.state = state
        self.columns = {
            "wanted": np.array([0.1, 0.2, np.nan, 0.4, 0.5]), "allowed": np.array([0.1, 0.1, 0.0, 0.4, 0.5]),
            "cut": np.zeros(5, dtype=int), "by": np.zeros(5), "touched": np.zeros(5, dtype=bool),
        } | changed  # fmt: skip

    def array(self, name):
        return self.columns[name]


STROKE = np.array([0.2, 0.4, 0.5, 0.8, 0.5])
ROWS = rows_of((("one", np.array([1])), ("some", np.array([0, 1, 3])), ("all", np.arange(5))), STROKE)


def test_a_row_is_the_mean_of_its_fibers_shares_of_stroke():
    shown = readings(ROWS, Moment())
    assert [one.wanted for one in shown] == pytest.approx([0.5, 0.5, (0.5 + 0.5 + 0.0 + 0.5 + 1.0) / 5])
    assert [one.allowed for one in shown] == pytest.approx([0.25, (0.5 + 0.25 + 0.5) / 3, (0.5 + 0.25 + 0.0 + 0.5 + 1.0) / 5])
    assert not any(one.cut or one.by or one.touched for one in shown)


def test_what_is_cut_and_what_a_hand_has_are_those_of_the_rows_own_fibers():
    code = next(number for number, cause in enumerate(CAUSES) if number and cause.shown)
    cut = Moment(cut=np.array([0, code, 0, 0, 0]), by=np.array([0, 0.2, 0, 0, 0]), touched=np.array([1, 0, 0, 0, 0], bool))
    one, some, all = readings(ROWS, cut)
    assert (one.cut, one.by, one.touched) == (CAUSES[code].shown, 0.5, False)
    assert (some.cut, some.touched, all.touched) == (CAUSES[code].shown, True, True)


@pytest.mark.parametrize("state", ["vented", "idle"])
def test_where_boards_are_disarmed_nothing_is_wanted_or_cut_whatever_was_last(state):
    last = Moment(state, cut=np.ones(5, dtype=int), by=np.ones(5))
    assert {(one.wanted, one.allowed, one.cut) for one in readings(ROWS, last)} == {(0.0, 0.0, "")}


def test_the_way_to_a_cue_is_written_anew_with_each_tenth_of_a_second_and_each_count():
    def coming(**changed):
        left = {"seconds": 3.21, "counts": 3.2, "bars": 0.8, "figure": 4, "unit": "counts", "beat": 1, "of": 4} | changed
        return Coming("tide", "5:1", False, CountIn(**left))

    assert as_shown(coming()) == as_shown(coming(seconds=3.23, counts=3.19))
    assert as_shown(coming()) != as_shown(coming(seconds=3.14))
    assert as_shown(coming()) != as_shown(coming(figure=3)) != as_shown(coming(beat=2))
