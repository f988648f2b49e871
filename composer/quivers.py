"""Quivers: sines of a steady frequency on top of a track, kept as what they are and never sampled.

After a time t of its T seconds a quiver of frequency f and amplitude A is, with w = 2 pi f,

    A sin(w t) fade(t) fade(T - t),    fade(t) = sin(w t) for the first quarter of a period, then 1.

Fading by the sine itself keeps it smooth and its rate never above w A: where it fades in it is A sin²(w t), whose rate is
w A sin(2 w t). Where it fades out it has the rate w A sin(w (T - t) - w t).
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Quivers:
    """Q quivers on top of the moves of tracks.

    knot, until: (Q,) a quiver begins at the instant of one knot and ends at that of a later one of the same fiber
    hertz, amplitude: (Q,) Hz, above 0; strain, not below 0
    """

    knot: Index
    until: Index
    hertz: Array
    amplitude: Array

    def __len__(self) -> int:
        return len(self.knot)


NONE = Quivers(*(np.empty(0, dtype=np.int64) for _ in range(2)), *(np.empty(0) for _ in range(2)))
"""No quiver at all."""


@dataclass(frozen=True, slots=True, eq=False)
class Over:
    """Which quivers lie over each of K segments: those of segment k are `which[first[k]:first[k + 1]]`; (Q,) their numbers.

    begins_s, lasts_s: (Q,) s; angular, amplitude: (Q,) radians a second; strain
    """

    first: Index
    which: Index
    begins_s: Array
    lasts_s: Array
    angular: Array
    amplitude: Array


def over(quivers: Quivers, time_s: Array) -> Over | None:
    """The quivers by the segments of tracks with such knots; None where nothing quivers, which then costs nothing."""
    if not len(quivers):
        return None
    segment, which = pairs(quivers)
    order = np.argsort(segment, kind="stable")
    first = np.concatenate([[0], np.cumsum(np.bincount(segment, minlength=len(time_s)))])
    begins = time_s[quivers.knot]
    angular = 2.0 * np.pi * quivers.hertz
    return Over(first, which[order], begins, time_s[quivers.until] - begins, angular, quivers.amplitude)


def pairs(quivers: Quivers) -> tuple[Index, Index]:
    """Every segment that a quiver lies over with that quiver's number, (P,) each, in order of quivers."""
    lengths = quivers.until - quivers.knot
    which = np.repeat(np.arange(len(lengths)), lengths)
    segment = np.arange(len(which)) - np.repeat(np.cumsum(lengths) - lengths, lengths) + quivers.knot[which]
    return segment, which


def strain_added(quivers: Over, segment: Index, time_s: Array) -> Array:
    """What the quivers over segments add to their strain at instants within them, (n,) each."""
    return _summed(quivers, segment, time_s, swing)


def rate_added(quivers: Over, segment: Index, time_s: Array) -> Array:
    """What the quivers over segments add to their strain rate in 1/s at instants within them, (n,) each."""
    return _summed(quivers, segment, time_s, swing_rate)


def _summed(quivers: Over, segment: Index, time_s: Array, of) -> Array:
    counts = quivers.first[segment + 1] - quivers.first[segment]
    row = np.repeat(np.arange(len(segment)), counts)
    if not len(row):
        return np.zeros(len(segment))
    place = np.arange(len(row)) - np.repeat(np.cumsum(counts) - counts, counts) + quivers.first[segment][row]
    which = quivers.which[place]
    gone = time_s[row] - quivers.begins_s[which]
    added = of(quivers.angular[which], quivers.amplitude[which], gone, quivers.lasts_s[which])
    return np.bincount(row, weights=added, minlength=len(segment))


def swing(angular: Array, amplitude: Array, gone_s: Array, lasts_s: Array) -> Array:
    """The strain of quivers after `gone_s` of their `lasts_s` seconds, any one shape; 0 before and after."""
    gone = np.clip(gone_s, 0.0, lasts_s)
    phase, left = angular * gone, angular * (lasts_s - gone)
    return amplitude * np.sin(phase) * _fade(phase) * _fade(left)


def swing_rate(angular: Array, amplitude: Array, gone_s: Array, lasts_s: Array) -> Array:
    """The strain rate in 1/s of quivers, as `swing`; never more than `angular * amplitude` either way."""
    gone = np.clip(gone_s, 0.0, lasts_s)
    phase, left = angular * gone, angular * (lasts_s - gone)
    sine, cosine, rises, falls = np.sin(phase), np.cos(phase), _fade(phase), _fade(left)
    opening = np.where(phase < QUARTER, cosine, 0.0)
    closing = np.where(left < QUARTER, np.cos(left), 0.0)
    return angular * amplitude * (cosine * rises * falls + sine * (opening * falls - rises * closing))


QUARTER = 0.5 * np.pi


def _fade(phase: Array) -> Array:
    return np.sin(np.minimum(phase, QUARTER))
