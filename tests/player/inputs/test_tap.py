import numpy as np
import pytest

from player.inputs.tap import LONGEST_S, MOST_TAPS, TapTempo


def taps(times):
    tap, beat = TapTempo(), None
    for at_s in times:
        beat = tap.tap(at_s)
    return beat


def test_two_taps_make_a_tempo_whose_counts_are_the_taps():
    assert taps([1.0]) is None
    beat = taps([1.0, 1.5])
    assert beat.rate == pytest.approx(2.0)
    assert beat.at(1.5) == pytest.approx(1.0)


def test_a_hand_that_is_20_ms_off_still_beats_the_tempo_within_3_percent():
    for seed in range(20):
        rng = np.random.default_rng(seed)
        beat = taps(100 + np.arange(MOST_TAPS) * 0.5 + rng.uniform(-0.02, 0.02, MOST_TAPS))
        assert beat.rate == pytest.approx(2.0, rel=0.03)


def test_a_pause_and_another_tempo_begin_anew():
    assert taps([0.0, 0.5, 1.0, 1.0 + LONGEST_S + 0.1]) is None
    assert taps([0.0, 0.5, 1.0, 2.0]).rate == pytest.approx(1.0)
    assert taps([0.0, 1.0, 2.0, 2.4, 2.8]).rate == pytest.approx(2.5)


def test_a_tap_that_bounces_is_one_tap():
    assert taps([0.0, 0.01, 0.5, 0.52, 1.0]).rate == pytest.approx(2.0)
