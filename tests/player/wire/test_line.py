import pytest
from hypothesis import given
from hypothesis import strategies as st

from player.wire import messages as m
from player.wire.frames import frame
from player.wire.line import SHARE, highest_rate, line_load, set_bytes, set_frames


def test_a_set_of_48_channels_takes_110_bytes_at_most():
    # type, seq, due, first, count: 10; values: 96; CRC: 2; stuffing: 1; delimiter: 1.
    assert set_bytes(48) == 110


@pytest.mark.parametrize("channels", [1, 48, 253, 1020, 1021, 4096])
def test_what_is_really_sent_is_never_more_than_what_was_worked_out(channels):
    values = [0xFFFF] * channels
    pieces = [values[n : n + m.VALUES_LIMIT] for n in range(0, channels, m.VALUES_LIMIT)]
    sent = sum(len(frame(m.encode(m.Set(0xFFFFFFFF, 0, tuple(piece)), 255))) for piece in pieces)
    assert sent <= set_bytes(channels) <= sent + len(pieces) * 10
    assert len(pieces) == set_frames(channels)


@given(st.integers(1, 4096), st.sampled_from([115_200, 230_400, 921_600, 2_000_000]))
def test_the_highest_rate_fits_and_one_more_does_not(channels, baud):
    rate = highest_rate(channels, baud)
    room = SHARE * baud / 10
    assert rate == 0 or line_load(channels, rate) <= room
    assert line_load(channels, rate + 1) > room


def test_48_channels_at_500_hz_need_more_than_115200_baud_and_less_than_2_million():
    assert line_load(48, 500.0) == pytest.approx(110 * 500 + 100)
    assert highest_rate(48, 115_200) < 500 <= highest_rate(48, 2_000_000)
