"""Sound a little ahead of the head."""

import numpy as np
import pytest

from composer.picture.preview.metronome import AHEAD_S, Metronome, chunk
from composer.picture.preview.play_head import PlayHead, started, with_loop, with_speed
from composer.score.tempo import TempoMap
from composer.sound.clicks import RATE_HZ

ZERO = np.zeros(1)
BARS = TempoMap(ZERO, ZERO, np.ones(1), ZERO, ZERO, ZERO, np.array([4.0]))


class Heard:
    """Stands in for the machine's audio."""

    def __init__(self, there=True, takes=True):
        self.there, self.takes = there, takes
        self.open = False
        self.bytes = b""
        self.starts = 0

    def start(self):
        self.open = self.there
        self.starts += 1
        return self.there

    def write(self, data):
        self.bytes += data
        return self.takes

    def stop(self):
        self.open = False


def onsets(sound):
    index = np.flatnonzero(np.abs(sound.astype(float)) > 300)
    return index[np.diff(index, prepend=-10_000) > 2500] / RATE_HZ


def test_a_loop_sounds_its_counts_again_and_again():
    head = with_loop(started(PlayHead(60.0, 2.5)), 2.5, 4.0)
    sound, after = chunk(head, BARS, 5 * RATE_HZ, 1.0)
    # Count 4 of bar 1 is at 3 s, half a second into a loop of a second and a half.
    assert onsets(sound) == pytest.approx([0.5, 2.0, 3.5], abs=3e-3)
    assert after.at_s == pytest.approx(2.5 + 0.5, abs=1e-3)


def test_beyond_the_end_it_is_silent():
    sound, after = chunk(started(PlayHead(2.5, 1.5)), BARS, 5 * RATE_HZ, 1.0)
    assert len(sound) == 5 * RATE_HZ
    assert onsets(sound) == pytest.approx([0.5], abs=3e-3)
    assert not after.playing


def test_it_hands_over_as_much_as_time_passes_and_a_little_ahead():
    heard = Heard()
    metronome = Metronome(heard)
    metronome.start(started(PlayHead(60.0)), BARS)
    for _ in range(100):
        metronome.run(0.016, BARS)
    assert len(heard.bytes) / 2 / RATE_HZ == pytest.approx(1.6 + AHEAD_S, abs=1e-3)


def test_at_twice_the_speed_it_hands_over_no_more_and_counts_come_twice_as_often():
    heard = Heard()
    metronome = Metronome(heard)
    metronome.start(with_speed(started(PlayHead(60.0, 0.5)), 2.0), BARS)
    metronome.run(3.0 - AHEAD_S, BARS)
    found = onsets(np.frombuffer(heard.bytes, dtype=np.int16))
    assert len(heard.bytes) / 2 / RATE_HZ == pytest.approx(3.0, abs=1e-3)
    assert np.diff(found) == pytest.approx(0.5, abs=3e-3)


def test_without_audio_nothing_is_written_and_nothing_raised():
    heard = Heard(there=False)
    metronome = Metronome(heard)
    metronome.start(started(PlayHead(60.0)), BARS)
    metronome.run(1.0, BARS)
    assert not heard.bytes
    assert not metronome.sounding


def test_once_audio_no_longer_takes_it_is_silent_until_it_starts_again():
    heard = Heard(takes=False)
    metronome = Metronome(heard)
    metronome.start(started(PlayHead(60.0)), BARS)
    once = len(heard.bytes)
    metronome.run(1.0, BARS)
    assert len(heard.bytes) == once
    metronome.start(started(PlayHead(60.0)), BARS)
    assert heard.starts == 2
