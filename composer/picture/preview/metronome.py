"""The counts heard while the transport plays: samples a little ahead of the play head, through loops and at any speed."""

import numpy as np
from numpy.typing import NDArray

from composer.picture.bars import Bars
from composer.picture.preview import play_head
from composer.picture.preview.play_head import PlayHead
from composer.sound.clicks import RATE_HZ, samples
from composer.sound.speaker import Speaker

AHEAD_S = 0.15
"""Seconds of sound that are handed over before they are due, as much as a busy window may be late."""

DEVICE_S = 0.06
"""What the machine's audio holds back, about: so much earlier than the picture the sound is sent."""


def chunk(head: PlayHead, bars: Bars, count: int, volume: float) -> tuple[NDArray[np.int16], PlayHead]:
    """The next `count` samples for a running head, and the head after them; silence beyond the end."""
    parts: list[NDArray[np.int16]] = []
    left = count
    while left > 0 and head.playing:
        end = head.end_s
        if head.loop_s is not None and head.at_s < head.loop_s[1]:
            end = head.loop_s[1]
        now = min(left, max(1, int(np.ceil((end - head.at_s) / head.speed * RATE_HZ))))
        parts.append(samples(bars, head.at_s, now, head.speed, volume))
        head = play_head.advanced(head, now / RATE_HZ)
        left -= now
    return np.concatenate([*parts, np.zeros(left, dtype=np.int16)]), head


class Metronome:
    """Clicks on the counts. Told when the head starts, stops, jumps and runs; on a machine without audio it does nothing."""

    def __init__(self, speaker: Speaker | None = None):
        self._speaker = speaker or Speaker()
        self._head: PlayHead | None = None
        self._given_s = self._passed_s = 0.0
        self.volume = 0.6

    @property
    def sounding(self) -> bool:
        """Whether there is sound."""
        return self._speaker.open

    def start(self, head: PlayHead, bars: Bars) -> None:
        """Begin with the head where it is; again after a jump, a change of speed or of the loop."""
        self.stop()
        if not head.playing or not self._speaker.start():
            return
        self._head = play_head.advanced(head, DEVICE_S)
        self._given_s = self._passed_s = 0.0
        self.run(0.0, bars)

    def run(self, passed_s: float, bars: Bars) -> None:
        """After `passed_s` more seconds of a person's time: hand over what is due soon."""
        if self._head is None:
            return
        self._passed_s += passed_s
        due = round((self._passed_s + AHEAD_S - self._given_s) * RATE_HZ)
        if due <= 0:
            return
        sound, self._head = chunk(self._head, bars, due, self.volume)
        self._given_s += due / RATE_HZ
        if not self._speaker.write(sound.tobytes()):
            self._head = None

    def stop(self) -> None:
        """Be silent."""
        self._head = None
        self._speaker.stop()
