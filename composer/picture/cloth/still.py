"""The cloth: time to the right, a thread a fiber; bars, pins and cues above, lanes below, all on one time axis."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QImage, QPainter, QPolygonF

from composer.picture import image
from composer.picture.axes import Tick, bar_ticks
from composer.picture.cloth import lanes, legend
from composer.picture.image import Image, Rows
from composer.picture.look import CENTRE, LEFT, RIGHT, Look, colour, pen
from composer.picture.palette import DARK, Theme
from composer.picture.scene import Scene, Stretch

LEAST_MARK = 5
"""Pixels, at scale 1, that a mark takes at least, so that a snag of an instant is still seen."""


@dataclass(frozen=True, slots=True)
class Layout:
    """Where things are, in pixels: the cloth's `left`, `top`, `width`, the most that it may be high, and the rows above it."""

    look: Look
    left: int
    top: int
    width: int
    room: int
    lane_room: int
    cues_top: int
    bars_top: int
    strip_top: int


def layout(width: int, height: int, lane_count: int = 3, theme: Theme = DARK) -> Layout:
    """The layout of a picture of that size with so many lanes."""
    look = Look(min(width / 1280, height / 800) if min(width / 1280, height / 800) > 1 else 1.0, theme)
    px = look.px
    left = px(168)
    cues_top = px(46)
    bars_top = cues_top + px(34)
    strip_top = bars_top + px(24)
    top = strip_top + px(10)
    lane_room = lane_count * px(54) if height >= 560 * look.scale else lane_count * px(34)
    room = height - top - lane_room - px(28) - px(40)
    return Layout(look, left, top, width - left - px(22), max(room, 1), lane_room, cues_top, bars_top, strip_top)


def paint(painter: QPainter, scene: Scene, width: int, height: int, theme: Theme = DARK) -> None:
    """Draw a whole cloth, with everything round it, into a picture of that size."""
    paint_in(painter, layout(width, height, len(scene.lanes), theme), scene, width, height)


def paint_in(painter: QPainter, plan: Layout, scene: Scene, width: int, height: int) -> None:
    """As `paint`, with the layout given: its width may be less than what there is room for."""
    rows = image.rows_of(scene.bands, plan.room)
    painter.fillRect(0, 0, width, height, colour(plan.look.theme.ground))
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    heading(painter, plan, rows, scene, width)
    threads(painter, plan, rows, scene)
    pins(painter, plan, rows, scene)
    cues(painter, plan, rows, scene)
    below = plan.top + rows.height
    free = height - below - plan.look.px(40) - plan.look.px(28)
    lanes.paint(painter, plan.look, scene, plan.left, below, plan.width, min(free, 2 * plan.lane_room))
    box = QRectF(plan.left, height - plan.look.px(36), width - plan.left - plan.look.px(22), plan.look.px(30))
    legend.paint(painter, plan.look, scene, box)


def heading(painter: QPainter, plan: Layout, rows: Rows, scene: Scene, width: int) -> None:
    """Draw the title and the bars."""
    _title(painter, plan, scene, width)
    bars(painter, plan, rows, scene)


def threads(painter: QPainter, plan: Layout, rows: Rows, scene: Scene) -> None:
    """Draw the threads with their names, bar lines and snags."""
    _threads(painter, plan, image.threads(scene.share, scene.extending, rows, plan.look.theme))
    _names(painter, plan, rows, scene)
    bar_lines_over(painter, plan, rows, scene)
    _snags(painter, plan, rows, scene)


def x_of(plan: Layout, scene: Scene, at_s: float) -> float:
    """The pixel column of an instant."""
    return plan.left + (at_s - scene.from_s) / (scene.to_s - scene.from_s) * plan.width


def _title(painter: QPainter, plan: Layout, scene: Scene, width: int) -> None:
    look = plan.look
    box = QRectF(look.px(16), look.px(10), width - look.px(38), look.px(30))
    used = look.write(painter, box, scene.title, 21, bold=True)
    rest = QRectF(box.left() + used + look.px(16), box.top() + look.px(3), box.width() - used - look.px(16), box.height())
    look.write(painter, rest, scene.subtitle, 13, look.theme.quiet_ink)


def bars(painter: QPainter, plan: Layout, rows: Rows, scene: Scene) -> None:
    """Draw the bars and counts above the cloth."""
    look = plan.look
    high = look.px(24)
    look.write(
        painter, QRectF(look.px(16), plan.bars_top, plan.left - look.px(36), high), "bar", 12, look.theme.quiet_ink, RIGHT
    )
    for tick in _ticks(plan, scene):
        x = x_of(plan, scene, tick.at)
        foot = plan.strip_top
        rise = look.px(7 if tick.label and tick.strong else 4 if tick.strong else 3)
        painter.setPen(pen(look.theme.quiet_ink if tick.strong else look.theme.line, max(1.0, look.scale * 0.9)))
        painter.drawLine(QPointF(x, foot - rise), QPointF(x, foot))
        if tick.label:
            box = QRectF(x - look.px(40), plan.bars_top, look.px(80), high - look.px(7))
            size, of = (12.5, look.theme.ink) if tick.strong else (10.5, look.theme.quiet_ink)
            look.write(painter, box, tick.label, size, of, CENTRE, bold=tick.strong)


_known_ticks = lru_cache(maxsize=4)(bar_ticks)
"""Asked for twice a frame: for the bars above, and for their lines through the cloth."""


def _ticks(plan: Layout, scene: Scene) -> tuple[Tick, ...]:
    look = plan.look
    return _known_ticks(scene.tempo, scene.from_s, scene.to_s, plan.width, look.px(34), look.px(7))


def bar_lines_over(painter: QPainter, plan: Layout, rows: Rows, scene: Scene) -> None:
    """Labelled bars go on through the cloth, faint enough to leave the threads their brightness."""
    for tick in _ticks(plan, scene):
        if tick.strong and tick.label:
            x = round(x_of(plan, scene, tick.at)) + 0.5
            painter.setPen(pen(plan.look.theme.ink, 1.0, 46))
            painter.drawLine(QPointF(x, plan.top), QPointF(x, plan.top + rows.height))


def _threads(painter: QPainter, plan: Layout, pixels: Image) -> None:
    if not pixels.size:
        return
    drawn = qimage(pixels)
    if drawn.width() == plan.width:
        painter.drawImage(plan.left, plan.top, drawn)
    else:
        painter.drawImage(QRectF(plan.left, plan.top, plan.width, drawn.height()), drawn)


def qimage(pixels: Image) -> QImage:
    """An image (height, width, 3) as Qt has it, with memory of its own."""
    pixels = np.ascontiguousarray(pixels)
    high, wide, _ = pixels.shape
    return QImage(pixels.data, wide, high, 3 * wide, QImage.Format.Format_RGB888).copy()


def _names(painter: QPainter, plan: Layout, rows: Rows, scene: Scene) -> None:
    """Names of bands beside a bracket; of fibers where they fit, else of the first and the last of each band."""
    look = plan.look
    line = look.px(13)
    wide = plan.left - look.px(10)
    taken = -np.inf
    for band in scene.bands:
        top, bottom = plan.top + rows.top[band.first], plan.top + rows.bottom[band.last - 1]
        painter.setPen(pen(look.theme.line, look.px(2)))
        x = plan.left - look.px(5)
        painter.drawLine(QPointF(x, top), QPointF(x, bottom))
        tall = rows.bottom[band.first] - rows.top[band.first]
        count = band.last - band.first
        each = range(band.first, band.last) if tall >= line else ()
        if tall < line and count > 1 and bottom - top >= 3 * line:
            each = (band.first, band.last - 1)
        for fiber in each:
            middle = plan.top + (rows.top[fiber] + rows.bottom[fiber]) / 2
            if tall < line:
                middle = top + line / 2 if fiber == band.first else bottom - line / 2
            box = QRectF(look.px(96), middle - line / 2, wide - look.px(96), line)
            look.write(painter, box, scene.names[fiber], 10.5, look.theme.quiet_ink, RIGHT)
        middle = (top + bottom) / 2
        if middle - line / 2 >= taken and (count > 1 or tall < line):
            room = look.px(88) if len(each) and (len(each) > 2 or bottom - top < 4 * line) else wide - look.px(12)
            box = QRectF(look.px(10), middle - line / 2, room, line)
            look.write(painter, box, band.name, 11.5, look.theme.ink, LEFT if room == look.px(88) else RIGHT, bold=True)
            taken = middle + line / 2


def _snags(painter: QPainter, plan: Layout, rows: Rows, scene: Scene) -> None:
    """A hatch over each snag of a fiber, and a strip above the cloth that shows when there is any."""
    look = plan.look
    least = look.px(LEAST_MARK)
    brush = look.hatch()
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
    painter.setClipRect(QRectF(plan.left, plan.strip_top, plan.width, plan.top + rows.height - plan.strip_top))
    for snag in scene.snags:
        if snag.fiber is None or snag.to_s < scene.from_s or snag.from_s > scene.to_s:
            continue
        left, right = _span(plan, scene, snag, least)
        painter.fillRect(QRectF(left, plan.strip_top + look.px(2), right - left, look.px(5)), colour(look.theme.limit))
        top, bottom = plan.top + rows.top[snag.fiber], plan.top + rows.bottom[snag.fiber]
        if bottom - top < least:
            top, bottom = (top + bottom - least) / 2, (top + bottom + least) / 2
        painter.fillRect(QRectF(left, top, right - left, bottom - top), brush)
    painter.restore()


def _span(plan: Layout, scene: Scene, snag: Stretch, least: float) -> tuple[float, float]:
    left, right = x_of(plan, scene, snag.from_s), x_of(plan, scene, snag.to_s)
    if right - left < least:
        left, right = (left + right - least) / 2, (left + right + least) / 2
    return left, right


def pins(painter: QPainter, plan: Layout, rows: Rows, scene: Scene) -> None:
    """A pin is a head on a needle that points at its instant."""
    look = plan.look
    for at in scene.pins_s:
        if scene.from_s <= at <= scene.to_s:
            pin_at(painter, look, x_of(plan, scene, at), plan.cues_top + look.px(24), plan.bars_top + look.px(3))


def pin_at(painter: QPainter, look: Look, x: float, top: float, foot: float) -> None:
    """Draw one pin, its head at `top`, its point at `foot`."""
    painter.setPen(pen(look.theme.pin, max(1.0, 1.2 * look.scale)))
    painter.drawLine(QPointF(x, top), QPointF(x, foot))
    painter.setBrush(colour(look.theme.pin))
    radius = look.px(3.5)
    painter.drawEllipse(QPointF(x, top), radius, radius)


def cues(painter: QPainter, plan: Layout, rows: Rows, scene: Scene) -> None:
    """A cue is a pennant with its name, and a dashed line down through the cloth; one that waits bears two bars."""
    look = plan.look
    high = look.px(17)
    ends = [-np.inf, -np.inf]
    for cue in sorted(scene.cues, key=lambda one: one.at_s):
        if not scene.from_s <= cue.at_s <= scene.to_s:
            continue
        x = x_of(plan, scene, cue.at_s)
        name = cue.name + (" (waits)" if cue.waits else "")
        wide = look.width(name, 12) + look.px(8)
        # A name that would run into the one before goes half a line lower; where both are taken it is left out.
        row = next((number for number, end in enumerate(ends) if end <= x), None)
        top = plan.cues_top + (row or 0) * look.px(15)
        painter.setPen(pen(look.theme.cue, max(1.0, 1.2 * look.scale), 200, (4.0, 4.0)))
        # The line leaves the bars' numbers free.
        painter.drawLine(QPointF(x, top), QPointF(x, plan.bars_top))
        painter.drawLine(QPointF(x, plan.strip_top), QPointF(x, plan.top + rows.height))
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(colour(look.theme.cue))
        painter.drawPolygon(QPolygonF([QPointF(x, top), QPointF(x + look.px(9), top + high / 3), QPointF(x, top + high / 1.5)]))
        if cue.waits:
            for shift in (-6, -10):
                painter.drawRect(QRectF(x + look.px(shift) if shift > 0 else x - look.px(-shift), top, look.px(2), high / 1.5))
        if row is not None:
            room = plan.left + plan.width + look.px(18) - x - look.px(12)
            look.write(painter, QRectF(x + look.px(12), top - look.px(3), min(wide, room), high), name, 12, look.theme.cue)
            ends[row] = x + look.px(16) + wide
