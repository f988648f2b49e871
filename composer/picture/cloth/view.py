"""Which part of a cloth a window shows, and where everything of it lies, in pixels of the screen."""

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from composer.picture.cloth.still import Layout
from composer.picture.image import Rows
from composer.picture.look import Look

NARROWEST_S = 0.02
"""No shorter stretch is shown: some frames of motion, four ticks of a player."""
FATTEST = 72
"""Pixels, at scale 1, that a thread may take when zoomed in."""
BAR_PX = 12
"""The scroll bars' width, in pixels of the window."""
RIGHT = 14
"""Pixels, at scale 1, right of the axis of time."""
FAT = 44
"""Pixels, at scale 1, that a thread takes at most while all are shown."""


@dataclass(frozen=True, slots=True, eq=False)
class View:
    """The layout round a cloth of `plan.width` by `plan.room` pixels, showing `from_s` to `to_s`, and rows from `scroll` on.

    rows: of all threads, as high as they are in all; scroll: how many of its pixels lie above what is shown
    lanes_top, axis_top: where the lanes begin, and where their axis of seconds does
    """

    plan: Layout
    rows: Rows
    scroll: int
    from_s: float
    to_s: float
    lanes_top: int
    lanes_height: int
    width: int
    height: int

    @property
    def look(self) -> Look:
        """Sizes and colours."""
        return self.plan.look

    @property
    def per_px(self) -> float:
        """Seconds a pixel."""
        return (self.to_s - self.from_s) / self.plan.width

    @property
    def shown(self) -> int:
        """How many pixels of the box have threads: fewer than it has where there are few."""
        return min(self.plan.room, self.rows.height)

    def x_of(self, at_s: float) -> float:
        """The pixel column of an instant."""
        return self.plan.left + (at_s - self.from_s) / (self.to_s - self.from_s) * self.plan.width

    def s_of(self, x: float) -> float:
        """The instant at a pixel column."""
        return self.from_s + (x - self.plan.left) * self.per_px

    def y_of(self, fiber: int) -> tuple[float, float]:
        """The top and bottom of a thread on the screen."""
        shift = self.plan.top - self.scroll
        return float(self.rows.top[fiber]) + shift, float(self.rows.bottom[fiber]) + shift

    def fiber_at(self, y: float) -> int | None:
        """The thread at a pixel row, the nearest one where it is a gap, None beside the threads."""
        inside = y - self.plan.top + self.scroll
        if not len(self.rows.top) or not 0 <= inside < self.rows.height or not 0 <= y - self.plan.top < self.plan.room:
            return None
        middle = (self.rows.top + self.rows.bottom) / 2
        place = int(np.searchsorted(middle, inside))
        around = [one for one in (place - 1, place) if 0 <= one < len(middle)]
        return min(around, key=lambda one: abs(middle[one] - inside))

    def fibers_shown(self) -> range:
        """The threads of which any pixel is shown."""
        begin = int(np.searchsorted(self.rows.bottom, self.scroll, side="right"))
        end = int(np.searchsorted(self.rows.top, self.scroll + self.plan.room))
        return range(begin, max(end, begin))

    def in_cloth(self, x: float, y: float) -> bool:
        """Whether a point lies among the threads."""
        return self.plan.left <= x < self.plan.left + self.plan.width and self.plan.top <= y < self.plan.top + self.shown

    def in_rulers(self, x: float, y: float) -> bool:
        """Whether a point lies on the bars above or on the lanes and the seconds below."""
        beside = y < self.plan.top or y >= self.lanes_top
        return beside and self.plan.left - self.look.px(6) <= x <= self.plan.left + self.plan.width + self.look.px(6)


def left_of(look: Look, width: int) -> int:
    """Where the axis of time begins: what lies below a cloth of the same width has its seconds in the same columns."""
    return look.px(168 if width >= 900 * look.scale else 108)


def laid_out(look: Look, width: int, height: int, rows_in: Callable[[int, int], Rows], lanes: int, zoom: float, place: float,
             from_s: float, to_s: float) -> View:  # fmt: skip
    """The view of a widget of that size, pixels: `zoom` 1 shows all threads, `place` the share of them that lies above.

    rows_in: lays the threads into a height, each at most so many pixels high
    """
    px = look.px
    left = left_of(look, width)
    cues_top = px(6)
    bars_top = cues_top + px(34)
    strip_top = bars_top + px(24)
    top = strip_top + px(10)
    tall = height >= 420 * look.scale
    each = px(52 if tall else 38) if height >= 260 * look.scale else 0
    lanes_height = lanes * each
    axis = px(22)
    room = max(height - top - lanes_height - axis - px(4), 1)
    plan = Layout(look, left, top, max(width - left - px(RIGHT), 1), room, lanes_height, cues_top, bars_top, strip_top)
    rows = rows_in(max(1, round(room * zoom)), px(FAT if zoom <= 1.0 else FATTEST))
    scroll = min(max(round(place * rows.height), 0), max(rows.height - room, 0))
    return View(plan, rows, scroll, from_s, to_s, top + room, lanes_height, width, height)


def most_zoom(look: Look, room: int, fibers: int) -> float:
    """How far threads can be zoomed: until each is as fat as one may be."""
    return max(1.0, fibers * (look.px(FATTEST) + look.px(6)) / max(room, 1))


def level_of(per_px: float) -> int:
    """The power of two seconds that a column of a tile lasts: at most a pixel."""
    return math.floor(math.log2(per_px))
