from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.inputs.timecode import RATES, Stamp, frames_of, is_label, seconds_of, stamp_of

DROP = RATES[2]


def test_the_codes_of_the_rates_are_those_of_the_standard(outside):
    assert [rate.name for rate in RATES] == outside["midi_time_code"]["rates"]


def test_ten_minutes_of_drop_frame_lose_18_numbers_and_an_hour_108(outside):
    table = outside["smpte_drop_frame"]
    ten, hour = Stamp(0, 10, 0, 0), Stamp(1, 0, 0, 0)
    assert frames_of(ten, DROP) == table["frames_in_10_minutes"] == 10 * 60 * 30 - table["dropped_in_10_minutes"]
    assert frames_of(hour, DROP) == table["frames_in_an_hour"] == 60 * 60 * 30 - table["dropped_in_an_hour"]


def test_an_hour_of_drop_frame_is_an_hour_but_for_4_milliseconds(outside):
    assert float(seconds_of(Stamp(1, 0, 0, 0), DROP)) - 3600 == pytest.approx(outside["smpte_drop_frame"]["hour_is_late_s"])


def test_the_frame_after_a_minute_s_last_has_number_2_but_not_in_every_tenth():
    after = [stamp_of(frames_of(Stamp(0, minute, 59, 29), DROP) + 1, DROP) for minute in (0, 8, 9, 58, 59)]
    assert [str(stamp) for stamp in after] == ["00:01:00:02", "00:09:00:02", "00:10:00:00", "00:59:00:02", "01:00:00:00"]


@pytest.mark.parametrize(
    ("stamp", "label"),
    [(Stamp(0, 1, 0, 0), False), (Stamp(0, 1, 0, 1), False), (Stamp(0, 1, 0, 2), True), (Stamp(0, 10, 0, 0), True),
     (Stamp(24, 0, 0, 0), False), (Stamp(0, 60, 0, 0), False), (Stamp(0, 0, 60, 0), False), (Stamp(0, 0, 0, 30), False)],
)  # fmt: skip
def test_labels_that_no_frame_has_are_told_apart(stamp, label):
    assert is_label(stamp, DROP) is label


@given(st.sampled_from(RATES), st.integers(0, 24 * 60 * 60 * 30))
def test_every_frame_comes_back_from_its_label_and_labels_are_right(rate, frames):
    frames %= frames_of(Stamp(24, 0, 0, 0), rate)
    stamp = stamp_of(frames, rate)
    assert is_label(stamp, rate)
    assert frames_of(stamp, rate) == frames


def test_counting_label_by_label_through_an_hour_drops_where_it_should():
    """By the rule itself, one label after the other, not by the closed form."""
    stamps = [Stamp(0, m, s, f) for m in range(60) for s in range(60) for f in range(30) if not (f < 2 and s == 0 and m % 10)]
    assert [stamp_of(number, DROP) for number in range(len(stamps))] == stamps


def test_a_second_has_as_many_frames_as_the_rate_says():
    assert [seconds_of(Stamp(0, 0, 1, 0), rate) for rate in RATES] == [1, 1, Fraction(1001, 1000), 1]
