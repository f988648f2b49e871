"""Threads worked out piece by piece: any fibers at any instants, in bits small enough to lie between two frames of a window."""

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.motion import motion_of, strain_in
from composer.picture import image
from composer.picture.image import THREAD_WITH_EDGE, Image, Rows
from composer.picture.palette import Theme
from composer.tracks import Tracks

Array = NDArray[np.float64]

AT_ONCE = 1 << 14
"""Values worked out between two looks at the clock: a millisecond or two."""

SPLIT_FROM = 7
"""From so many pixels on, a thread has room for what it would be instead, below what it is."""


class Sampler:
    """Tracks made ready for asking at scattered places: one search serves many fibers, so a few cost little among thousands."""

    def __init__(self, tracks: Tracks, abilities: Abilities):
        self._motion = motion_of(tracks, abilities)
        self._stroke = abilities.stroke
        self._last_s = float(tracks.time_s.max(initial=0.0)) + 1.0
        self._span = self._last_s + 1.0
        fiber = np.repeat(np.arange(tracks.fibers), np.diff(tracks.first))
        self._keys = fiber * self._span + tracks.time_s

    def shares(self, fibers: NDArray[np.int64], times_s: Array) -> Array:
        """Strain as a share of stroke, (n, T): of `fibers` (n,) at `times_s` (T,); before 0 s and past the end as there."""
        times = np.clip(times_s, 0.0, self._last_s)
        asked = (fibers[:, None] * self._span + times).ravel()
        segment = np.searchsorted(self._keys, asked, side="right") - 1
        each = np.repeat(fibers, len(times))
        strain = strain_in(self._motion, each, segment, np.tile(times, len(fibers)))
        return strain.reshape(len(fibers), len(times)) / self._stroke[fibers, None]


@lru_cache(maxsize=2)
def sampler_of(tracks: Tracks, abilities: Abilities) -> Sampler:
    """The sampler of some tracks; kept for what is shown and what would be instead, as several views ask for the same.

    No more are kept: each holds its tracks, a hundred megabytes for a million moves.
    """
    return Sampler(tracks, abilities)


@lru_cache(maxsize=1)
def differing(tracks: Tracks, other: Tracks) -> NDArray[np.bool_]:
    """(F,) which fibers move otherwise in `other`, tracks of as many fibers."""
    count, theirs = np.diff(tracks.first), np.diff(other.first)
    differs = count != theirs
    alike = np.flatnonzero(~differs)
    if len(alike) == tracks.fibers:
        here = there = slice(None)
        fiber = np.repeat(alike, count)
    else:
        within = np.arange(int(count[alike].sum())) - np.repeat(np.cumsum(count[alike]) - count[alike], count[alike])
        here, there = (np.repeat(one.first[:-1][alike], count[alike]) + within for one in (tracks, other))
        fiber = np.repeat(alike, count[alike])
    time, curve, time_there, curve_there = tracks.time_s[here], tracks.curve[here], other.time_s[there], other.curve[there]
    # Most knots are the very same, which is soon seen; the few others may still be so within rounding.
    rest = np.flatnonzero((time != time_there) | (curve != curve_there).any(axis=1))
    apart = np.abs(time[rest] - time_there[rest]) > 1e-6
    apart |= (np.abs(curve[rest] - curve_there[rest]) > 1e-9).any(axis=1)
    differs[fiber[rest[apart]]] = True
    return differs


@dataclass(frozen=True, slots=True, eq=False)
class Source:
    """What threads are drawn from: what they are, which way each goes (F,), and what they would be instead, where they differ.

    ghost: None for none; differs: (F,) the fibers whose ghost is another
    """

    sampler: Sampler
    extending: NDArray[np.bool_]
    ghost: Sampler | None = None
    differs: NDArray[np.bool_] | None = None


def rendered(source: Source, rows: Rows, top: int, height: int, times_s: Array, theme: Theme, coarse: bool) -> Iterator[Image]:
    """Draw rows `top` to before `top + height` of a cloth, a column for each of `times_s`; yields the image as it grows.

    The same array comes again and again, complete when the iteration ends: whoever draws may stop to look at the clock.
    coarse: of threads too many for their pixels, draw one a pixel row, at once a picture to be made good later
    """
    drawn = np.empty((height, len(times_s), 3), dtype=np.uint8)
    drawn[:] = theme.ground
    begin = int(np.searchsorted(rows.bottom, top, side="right"))
    end = int(np.searchsorted(rows.top, top + height))
    each = max(1, AT_ONCE // max(len(times_s), 1))
    if rows.crowded:
        yield from _crowded(drawn, source, rows, top, times_s, theme, (begin, end), each, coarse)
        return
    for first in range(begin, end, each):
        fibers = np.arange(first, min(first + each, end))
        _whole(drawn, source, rows, top, times_s, theme, fibers)
        yield drawn


def _whole(drawn: Image, source: Source, rows: Rows, top: int, times_s: Array, theme: Theme, fibers: NDArray[np.int64]) -> None:
    """Threads of a pixel or more, a run of them, into the picture, cut where they reach over its edges."""
    above = rows.top[fibers[0]]
    tall = int(rows.bottom[fibers[0]] - rows.top[fibers[0]])
    run = Rows(int(rows.bottom[fibers[-1]] - above), rows.top[fibers] - above, rows.bottom[fibers] - above, False)
    made = image.threads(source.sampler.shares(fibers, times_s), source.extending[fibers], run, theme)
    if source.ghost is not None and source.differs is not None and tall >= SPLIT_FROM:
        other = fibers[source.differs[fibers]]
        if len(other):
            colour = image.colours(source.ghost.shares(other, times_s), source.extending[other], theme)
            below, foot = split(tall)
            at = (rows.top[other] - above).astype(int)
            made[at + below - 1] = theme.ground
            for row in range(below, foot):
                made[at + row] = colour
    shift = int(above) - top
    begin, end = max(shift, 0), min(shift + len(made), len(drawn))
    part = made[begin - shift : end - shift]
    # A run of threads covers the gaps among them too, which are ground in either.
    drawn[begin:end] = part


def split(tall: int) -> tuple[int, int]:
    """The rows of a thread `tall` pixels high in which its ghost lies: from, to before; above it a row of ground."""
    edge = tall // 4 if tall >= THREAD_WITH_EDGE else 0
    foot = tall - (edge - edge // 2)
    return edge // 2 + (foot - edge // 2) * 3 // 5 + 1, foot


def _crowded(
    drawn: Image, source: Source, rows: Rows, top: int, times_s: Array, theme: Theme, run: tuple[int, int], each: int,
    coarse: bool,
) -> Iterator[Image]:  # fmt: skip
    """Several threads a pixel: the mean of their colours, or of one of them where `coarse`."""
    middle = (rows.top + rows.bottom) / 2 - top
    edges = np.searchsorted(middle, np.arange(len(drawn) + 1))
    per_row = max(1, int(np.diff(edges).max(initial=1)))
    step = max(1, each // (1 if coarse else per_row))
    for first in range(0, len(drawn), step):
        last = min(first + step, len(drawn))
        if coarse:
            row = np.arange(first, last)
            fiber = np.clip((edges[first:last] + edges[first + 1 : last + 1]) // 2, run[0], max(run[1] - 1, run[0]))
            there = (rows.top[fiber] - top < row + 1) & (rows.bottom[fiber] - top > row)
            if there.any():
                which = fiber[there]
                drawn[row[there]] = image.colours(source.sampler.shares(which, times_s), source.extending[which], theme)
        else:
            begin = max(int(edges[first]) - 1, run[0])
            end = min(int(edges[last]) + 1, run[1])
            if begin < end:
                fibers = np.arange(begin, end)
                shift = top + first
                part = Rows(last - first, rows.top[fibers] - shift, rows.bottom[fibers] - shift, True)
                drawn[first:last] = image.threads(source.sampler.shares(fibers, times_s), source.extending[fibers], part, theme)
        yield drawn
