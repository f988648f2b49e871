"""Time code after SMPTE ST 12-1: hours, minutes, seconds and frames to and from a number of frames, drop frame and plain.

With drop frame, numbers 0 and 1 of each minute but every tenth are left out, so that 30 numbers a second keep step with
30000/1001 frames a second: 18 in ten minutes.
"""

from dataclasses import dataclass
from fractions import Fraction


@dataclass(frozen=True, slots=True)
class Rate:
    """A frame rate: frame numbers in a second, true frames a second, and whether numbers are dropped."""

    name: str
    numbers: int
    per_s: Fraction
    drop: bool


RATES = (
    Rate("24", 24, Fraction(24), False),
    Rate("25", 25, Fraction(25), False),
    Rate("30 drop", 30, Fraction(30000, 1001), True),
    Rate("30", 30, Fraction(30), False),
)
"""By the code that MIDI time code gives them."""


@dataclass(frozen=True, slots=True)
class Stamp:
    """One frame's label."""

    hours: int
    minutes: int
    seconds: int
    frames: int

    def __str__(self) -> str:
        return f"{self.hours:02d}:{self.minutes:02d}:{self.seconds:02d}:{self.frames:02d}"


def is_label(stamp: Stamp, rate: Rate) -> bool:
    """Whether a frame of this rate has this label."""
    in_range = stamp.hours < 24 and stamp.minutes < 60 and stamp.seconds < 60 and stamp.frames < rate.numbers
    dropped = rate.drop and stamp.frames < 2 and stamp.seconds == 0 and stamp.minutes % 10 != 0
    return in_range and not dropped


def frames_of(stamp: Stamp, rate: Rate) -> int:
    """Frames since 00:00:00:00."""
    minutes = 60 * stamp.hours + stamp.minutes
    labels = (60 * minutes + stamp.seconds) * rate.numbers + stamp.frames
    return labels - 2 * (minutes - minutes // 10) if rate.drop else labels


def stamp_of(frames: int, rate: Rate) -> Stamp:
    """The label of a frame, from midnight on again after a day."""
    frames %= frames_of(Stamp(24, 0, 0, 0), rate)
    if rate.drop:
        tens, rest = divmod(frames, 17982)
        # Nine minutes of 1798 follow one of 1800.
        frames += 18 * tens + (2 * ((rest - 2) // 1798) if rest > 1 else 0)
    seconds, frame = divmod(frames, rate.numbers)
    minutes, second = divmod(seconds, 60)
    return Stamp(minutes // 60, minutes % 60, second, frame)


def seconds_of(stamp: Stamp, rate: Rate) -> Fraction:
    """True seconds since 00:00:00:00."""
    return frames_of(stamp, rate) / rate.per_s
