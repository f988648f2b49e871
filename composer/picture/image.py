"""The threads as one image, in numpy alone: strain over time becomes rows of colour; windows scroll it, files show it."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.limits.abilities import Abilities
from composer.motion import strain_at
from composer.picture import palette
from composer.picture.bands import Band
from composer.picture.palette import DARK, Theme
from composer.tracks import Tracks

Array = NDArray[np.float64]
Image = NDArray[np.uint8]

WIDEST_THREAD = 44
THREAD_WITH_EDGE = 4
"""From so many pixels on, a thread leaves a quarter of its rows dark, so that each is seen as one."""


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """Where threads lie in an image `height` pixels high: `top` (F,) to `bottom` (F,), in pixels; whole ones unless crowded.

    crowded: there are more threads than pixels, so that a row shows the mean of those in it
    """

    height: int
    top: Array
    bottom: Array
    crowded: bool


def rows_of(bands: Sequence[Band], height: int, widest: int = WIDEST_THREAD) -> Rows:
    """Lay threads into at most `height` pixels, all alike and at most `widest` high, with a gap between bands."""
    fibers = bands[-1].last if bands else 0
    band = np.repeat(np.arange(len(bands)), [one.last - one.first for one in bands])
    gaps = max(len(bands) - 1, 0)
    if not fibers:
        return Rows(0, np.zeros(0), np.zeros(0), False)
    thread = min(height // fibers, widest)
    gap = min(max(3, thread // 2 + 2), 10)
    while thread > 1 and thread * fibers + gap * gaps > height:
        thread -= 1
        gap = min(max(2, thread // 2 + 2), 10)
    if thread >= 1 and thread * fibers + gap * gaps <= height:
        top = np.arange(fibers) * thread + band * gap
        return Rows(int(top[-1] + thread), top.astype(float), (top + thread).astype(float), False)
    # More threads than pixels: gaps stay as long as they take no more than a fifth of the height.
    gap = 2 if 2 * gaps <= height // 5 else 0
    thread = (height - gap * gaps) / fibers
    top = np.arange(fibers) * thread + band * gap
    return Rows(height, top, top + thread, True)


def column_times(from_s: float, to_s: float, width: int) -> Array:
    """The instant in the middle of each of `width` pixel columns that share the time between them, (width,)."""
    return from_s + (np.arange(width) + 0.5) * (to_s - from_s) / width


def shares(tracks: Tracks, abilities: Abilities, times_s: ArrayLike) -> Array:
    """Strain as a share of each fiber's usable stroke, (F, T): what tracks want at those times."""
    return strain_at(tracks, abilities, times_s) / abilities.stroke[:, None]


def extends(abilities: Abilities) -> NDArray[np.bool_]:
    """(F,) which fibers lengthen when they fill."""
    by_make = np.array([one.direction == "extend" for one in abilities.capabilities], dtype=bool)
    return by_make[abilities.which]


def colours(share: ArrayLike, extending: NDArray[np.bool_], theme: Theme = DARK) -> Image:
    """Colours (F, T, 3) of shares of stroke (F, T): lightness by share, hue by direction; beyond 0 and 1 as at the end."""
    # fmax and fmin take the number where the other is nan.
    held = np.fmin(np.fmax(share, 0.0), 1.0)
    step = (held * (palette.STEPS - 1) + 0.5).astype(np.intp)
    both = np.concatenate([theme.contract, theme.extend])
    return both.take(step + palette.STEPS * np.asarray(extending)[:, None], axis=0)


def threads(share: ArrayLike, extending: NDArray[np.bool_], rows: Rows, theme: Theme = DARK) -> Image:
    """The image (height, T, 3) of threads laid out as `rows`: gaps and edges in the ground's colour."""
    share = np.asarray(share)
    image = np.empty((rows.height, share.shape[1], 3), dtype=np.uint8)
    image[:] = theme.ground
    if rows.crowded:
        return _crowded(image, share, extending, rows, theme)
    colour = colours(share, extending, theme)
    top = rows.top.astype(int)
    tall = int(rows.bottom[0] - rows.top[0]) if len(top) else 0
    edge = tall // 4 if tall >= THREAD_WITH_EDGE else 0
    for row in range(edge // 2, tall - (edge - edge // 2)):
        image[top + row] = colour
    return image


def _crowded(image: Image, share: Array, extending: NDArray[np.bool_], rows: Rows, theme: Theme) -> Image:
    """Each pixel row the mean colour of the threads whose middle lies in it, or else of the nearest within half a pixel."""
    middle = (rows.top + rows.bottom) / 2
    edges = np.searchsorted(middle, np.arange(rows.height + 1))
    covering = np.searchsorted(rows.bottom, np.arange(rows.height) + 0.5, side="right")
    colour = colours(share, extending, theme)
    there = np.flatnonzero(edges[1:] > edges[:-1])
    if there.size:
        # Rows that have threads are one after another in order of threads: what lies between two is all of the first's.
        run = colour[edges[there[0]] : edges[there[-1] + 1]]
        total = np.add.reduceat(run, edges[there] - edges[there[0]], axis=0, dtype=np.uint32)
        count = (edges[there + 1] - edges[there])[:, None, None]
        image[there] = (total + count // 2) // count
    for row in np.flatnonzero(edges[1:] == edges[:-1]):
        fiber = covering[row]
        if fiber < len(middle) and rows.top[fiber] <= row + 0.5:
            image[row] = colour[fiber]
    return image
