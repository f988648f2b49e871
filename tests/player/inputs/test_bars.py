import pytest

from composer.faults import Faults
from player.inputs.bars import bars_of
from player.inputs.midi_file import Times


def bars(*meters, division=96):
    return bars_of(Times(division, meters, (), ()), "f")


def test_places_are_exact():
    found = bars((0, 3, 4), (96 * 9, 6, 8))
    assert [found.place(tick) for tick in (0, 96, 96 * 3, 144, 96 * 9, 96 * 9 + 48, 96 * 9 + 16)] == [
        "1:1", "1:2", "2:1", "1:2.5", "4:1", "4:2", "4:1+1/3",
    ]  # fmt: skip


def test_without_a_meter_bars_have_four_quarters():
    assert bars().place(96 * 5) == "2:2"


def test_a_meter_that_changes_within_a_bar_makes_that_bar_short():
    found = bars((0, 4, 4), (96 * 6, 3, 4))
    assert [(s.bar, s.counts, s.note) for s in found.stretches] == [(0, 4, 4), (1, 2, 4), (2, 3, 4)]
    assert [(s.bar, s.counts, s.note) for s in bars((0, 4, 4), (96 * 2 + 48, 4, 4)).stretches] == [(0, 5, 8), (1, 4, 4)]


def test_a_change_that_no_note_value_reaches_is_told():
    with pytest.raises(Faults, match=r"f: the meter changes within bar 1, after 1\.0104\d* counts"):
        bars((0, 4, 4), (97, 3, 4))


def test_a_meter_with_more_counts_than_a_score_has_is_told():
    with pytest.raises(Faults, match="a meter of 200/4"):
        bars((0, 200, 4))


def test_the_same_meter_said_again_is_no_change():
    assert len(bars((0, 4, 4), (96 * 4, 4, 4), (96 * 8, 4, 4)).stretches) == 1
