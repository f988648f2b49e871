"""Clicks on the counts, as samples."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.score.tempo import TempoMap
from composer.sound.clicks import CLICK_S, FIRST_HZ, OTHER_HZ, RATE_HZ, click, counts_between, samples


def bars(rate=1.0, per_bar=4.0):
    zero = np.zeros(1)
    return TempoMap(zero, zero, np.array([rate]), zero, zero, zero, np.array([per_bar]))


WALTZ_FROM_BAR_3 = TempoMap(
    np.zeros(1), np.zeros(1), np.array([2.0]), np.zeros(1), np.array([0.0, 8.0]), np.array([0.0, 2.0]), np.array([4.0, 3.0])
)


def onsets(sound):
    """The samples at which sound begins after silence."""
    loud = np.abs(sound.astype(float)) > 300
    index = np.flatnonzero(loud)
    return index[np.diff(index, prepend=-10_000) > round(CLICK_S * RATE_HZ)] if len(index) else index


def pitch(sound):
    """The frequency with the most power."""
    power = np.abs(np.fft.rfft(sound, 1 << 16))
    return np.argmax(power) * RATE_HZ / (1 << 16)


def test_counts_stand_at_the_instants_of_the_tempo_map_and_the_first_of_each_bar_is_marked():
    at, first = counts_between(WALTZ_FROM_BAR_3, 0.0, 7.0)
    assert at == pytest.approx(np.arange(14) * 0.5)
    assert np.flatnonzero(first).tolist() == [0, 4, 8, 11]


def test_no_count_is_named_twice_or_lost_between_stretches():
    whole, _ = counts_between(WALTZ_FROM_BAR_3, 0.0, 6.0)
    parts = [counts_between(WALTZ_FROM_BAR_3, begin, begin + 0.25)[0] for begin in np.arange(0.0, 6.0, 0.25)]
    assert np.concatenate(parts) == pytest.approx(whole)


def test_each_count_sounds_at_its_instant_and_the_first_of_a_bar_higher():
    sound = samples(bars(), 0.0, 5 * RATE_HZ)
    begin = onsets(sound)
    assert begin / RATE_HZ == pytest.approx(np.arange(5), abs=2e-3)
    heard = [pitch(sound[at : at + 1900]) for at in begin]
    assert heard == pytest.approx([FIRST_HZ, OTHER_HZ, OTHER_HZ, OTHER_HZ, FIRST_HZ], rel=0.02)


def test_at_half_the_speed_counts_come_half_as_often_at_the_same_pitch():
    sound = samples(bars(), 0.0, 5 * RATE_HZ, speed=0.5)
    assert onsets(sound) / RATE_HZ == pytest.approx([0.0, 2.0, 4.0], abs=2e-3)
    assert pitch(sound[onsets(sound)[1] :][:1900]) == pytest.approx(OTHER_HZ, rel=0.02)


@given(cut=st.integers(1, 2 * RATE_HZ - 1), speed=st.sampled_from([0.25, 0.5, 1.0, 2.0]))
def test_stretches_that_follow_one_another_join_without_a_seam(cut, speed):
    whole = samples(bars(2.0), 0.0, 2 * RATE_HZ, speed)
    first = samples(bars(2.0), 0.0, cut, speed)
    second = samples(bars(2.0), cut / RATE_HZ * speed, 2 * RATE_HZ - cut, speed)
    joined = np.concatenate([first, second]).astype(int)
    # Half a sample's rounding of where a click begins is all that may differ.
    assert abs(len(onsets(joined)) - len(onsets(whole))) == 0
    assert np.abs(onsets(joined) - onsets(whole)).max() <= 1


def test_volume_scales_and_zero_is_silence():
    loud, soft = (np.abs(samples(bars(), 0.0, 4000, volume=v).astype(float)).max() for v in (1.0, 0.25))
    assert soft == pytest.approx(loud / 4.0, rel=1e-3)
    assert not samples(bars(), 0.0, 4000, volume=0.0).any()


def test_a_click_begins_and_ends_in_silence():
    sound = click(FIRST_HZ)
    assert abs(sound[0]) < 1e-9
    assert abs(sound[-1]) < 1e-3
    assert np.abs(sound).max() <= 1.0


def test_counts_too_close_to_be_told_apart_sound_no_more_than_so_often():
    sound = samples(bars(200.0, 400.0), 0.0, RATE_HZ)
    assert np.abs(sound.astype(int)).max() <= 32767
    at, first = counts_between(bars(200.0, 400.0), 0.0, 1.0)
    assert (len(at), int(first.sum())) == (200, 1)
