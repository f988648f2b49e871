"""How a strand is drawn: the band of what the fiber can do, three curves, knots, and what a snag needs against what it has."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from PySide6.QtCore import QLineF, QPointF, QRect, QRectF, Qt
from PySide6.QtGui import QPainter, QPolygonF

from composer.limits.abilities import Abilities
from composer.picture.axes import bar_ticks, grid_lines, value_ticks
from composer.picture.bars import Bars
from composer.picture.cloth.over import rhomb
from composer.picture.cloth.sampling import Sampler
from composer.picture.cloth.view import RIGHT as BESIDE
from composer.picture.cloth.view import left_of
from composer.picture.look import CENTRE, LEFT, RIGHT, Look, colour, pen
from composer.picture.palette import Colour, Theme
from composer.picture.strand.curve import Knots, reach

Array = NDArray[np.float64]

WITHIN, ENDS = "within reach", "rest, full stroke"
"""What each move could get to from where it begins; the ends of what can be asked for."""

MOST_KNOTS = 400
"""Knots drawn at once; zoomed out further they would cover the curve."""


@dataclass(frozen=True, slots=True, eq=False)
class Strand:
    """What is drawn: a fiber with its knots, samplers of what is written and retimed, (instants, strains) as simulated."""

    name: str
    fiber: int
    abilities: Abilities
    tempo: Bars
    knots: Knots
    written: Sampler
    retimed: Sampler | None
    simulated: tuple[Array, Array] | None
    snags: tuple[tuple[float, float, str], ...]


@dataclass(frozen=True, slots=True)
class Face:
    """The plot's box in pixels of the screen, and what its edges mean: seconds, and strain from `low` to `high`."""

    look: Look
    box: QRectF
    from_s: float
    to_s: float
    low: float
    high: float
    per_strain: float
    unit: str

    @property
    def per_px(self) -> float:
        """Seconds a pixel."""
        return (self.to_s - self.from_s) / self.box.width()

    @property
    def strain_px(self) -> float:
        """Strain a pixel."""
        return (self.high - self.low) / self.box.height()

    def x_of(self, at_s: ArrayLike) -> Array:
        """Pixel columns of instants."""
        return self.box.left() + (np.asarray(at_s, dtype=float) - self.from_s) / self.per_px

    def y_of(self, strain: ArrayLike) -> Array:
        """Pixel rows of strains."""
        return self.box.bottom() - (np.asarray(strain, dtype=float) - self.low) / self.strain_px

    def s_of(self, x: float) -> float:
        """The instant of a pixel column."""
        return self.from_s + (x - self.box.left()) * self.per_px


def face(look: Look, size: tuple[int, int], from_s: float, to_s: float, least: float, most: float, per_strain: float,
         unit: str) -> Face:  # fmt: skip
    """The face of a strand in so many pixels; its axis of time lies as that of a cloth in as many does."""
    px = look.px
    left = left_of(look, size[0])
    room = 0.07 * (most - least)
    box = QRectF(left, px(26), max(size[0] - left - px(BESIDE), 1), max(size[1] - px(26) - px(24), 1))
    return Face(look, box, from_s, to_s, least - room, most + room, per_strain, unit)


def nothing(painter: QPainter, box: QRect, theme: Theme, words: str) -> None:
    """What an empty strand says."""
    Look(1.0, theme).write(painter, QRectF(box), words, 13, theme.quiet_ink, CENTRE)


def paint(painter: QPainter, at: Face, strand: Strand, chosen: int) -> None:
    """Draw a strand with its axes: all but what moves over it."""
    look, box = at.look, at.box
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    _axes(painter, at, strand)
    painter.save()
    painter.setClipRect(box)
    _band(painter, at, strand)
    _snags(painter, at, strand)
    times = at.from_s + (np.arange(int(box.width()) + 1)) * at.per_px
    fiber, stroke = np.array([strand.fiber]), float(strand.abilities.stroke[strand.fiber])
    theme = look.theme
    _curve(painter, at, times, strand.written.shares(fiber, times)[0] * stroke, theme.written, 2.2)
    if strand.retimed is not None:
        _curve(painter, at, times, strand.retimed.shares(fiber, times)[0] * stroke, theme.retimed, 2.0, (5.0, 2.5))
    if strand.simulated is not None:
        when, strain = strand.simulated
        near = (when >= at.from_s - at.per_px) & (when <= at.to_s + at.per_px)
        near |= np.roll(near, 1) | np.roll(near, -1)
        step = max(1, int(np.count_nonzero(near) // max(2 * box.width(), 1)))
        _curve(painter, at, when[near][::step], strain[near][::step], theme.simulated, 1.6, (1.5, 1.5))
    _knots(painter, at, strand, chosen)
    _words(painter, at, strand)
    painter.restore()


def _axes(painter: QPainter, at: Face, strand: Strand) -> None:
    look, box, px = at.look, at.box, at.look.px
    theme = look.theme
    painter.fillRect(box, colour(theme.panel))
    look.write(painter, QRectF(px(8), px(4), box.left() - px(14), px(18)), strand.name, 12.5, theme.ink, LEFT, bold=True)
    look.write(painter, QRectF(px(8), box.top(), box.left() - px(52), px(16)), _measure(at.unit), 10.5, theme.quiet_ink)
    for value in value_ticks(at.low * at.per_strain, at.high * at.per_strain, max(2, int(box.height() / px(24)))):
        y = float(at.y_of(value / at.per_strain))
        painter.setPen(pen(theme.faint_line))
        painter.drawLine(QPointF(box.left(), y), QPointF(box.right(), y))
        room = QRectF(box.left() - px(46), y - px(7), px(40), px(14))
        look.write(painter, room, f"{value:g}", 10.5, theme.quiet_ink, RIGHT)
    for tick in bar_ticks(strand.tempo, at.from_s, at.to_s, box.width(), px(40), px(7)):
        x = float(at.x_of(tick.at))
        painter.setPen(pen(theme.line if tick.strong else theme.faint_line))
        painter.drawLine(QPointF(x, box.top()), QPointF(x, box.bottom()))
        if tick.label:
            room = QRectF(x - px(40), box.bottom() + px(3), px(80), px(16))
            look.write(painter, room, tick.label, 11, theme.ink if tick.strong else theme.quiet_ink, CENTRE, bold=tick.strong)
    _legend(painter, at, strand)


def _measure(unit: str) -> str:
    return {"mm": "mm", "°": "degrees", "%": "% stroke"}[unit]


def _legend(painter: QPainter, at: Face, strand: Strand) -> None:
    look, px, theme = at.look, at.look.px, at.look.theme
    x = at.box.left()
    rows = [("written", theme.written, ())]
    if strand.retimed is not None:
        rows.append(("retimed", theme.retimed, (5.0, 2.5)))
    if strand.simulated is not None:
        rows.append(("as it would move", theme.simulated, (1.5, 1.5)))
    middle = px(13)
    for word, of, dash in rows:
        painter.setPen(pen(of, look.px(2), dash=dash))
        painter.drawLine(QPointF(x, middle), QPointF(x + px(24), middle))
        x += px(30)
        x += look.write(painter, QRectF(x, middle - px(9), px(160), px(18)), word, 11.5, of) + px(20)
    swatch = QRectF(x, middle - px(5), px(18), px(10))
    painter.fillRect(swatch, colour(theme.able))
    painter.setPen(pen(theme.edge, look.px(1)))
    painter.drawRect(swatch)
    x += px(24)
    x += look.write(painter, QRectF(x, middle - px(9), at.box.right() - x, px(18)), WITHIN, 11.5, theme.quiet_ink) + px(20)
    if x + px(30) + look.width(ENDS, 11.5) <= at.box.right():
        painter.setPen(pen(theme.limit, look.px(1.2), dash=(5.0, 3.0)))
        painter.drawLine(QPointF(x, middle), QPointF(x + px(24), middle))
        look.write(painter, QRectF(x + px(30), middle - px(9), at.box.right() - x, px(18)), ENDS, 11.5, theme.limit)


def _band(painter: QPainter, at: Face, strand: Strand) -> None:
    """How far each move could get, from where it begins; the stroke's ends as lines."""
    knots, theme, look = strand.knots, at.look.theme, at.look
    seen = np.flatnonzero((knots.at_s >= at.from_s) & (knots.from_s <= at.to_s))[:MOST_KNOTS]
    painter.setPen(Qt.PenStyle.NoPen)
    painter.setBrush(colour(theme.able))
    ways = reach(strand.abilities, strand.fiber, knots, seen)
    for when, low, high in ways:
        x = at.x_of(when)
        points = [*zip(x, at.y_of(high), strict=True), *zip(x[::-1], at.y_of(low[::-1]), strict=True)]
        painter.drawPolygon(QPolygonF([QPointF(float(a), float(b)) for a, b in points]))
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.setPen(pen(theme.edge, look.px(1)))
    for when, low, high in ways:
        for way in (low, high):
            painter.drawPolyline(_points(at, when, way))
    stroke = float(strand.abilities.stroke[strand.fiber])
    painter.setPen(pen(theme.limit, look.px(1.2), dash=(5.0, 3.0)))
    for level in (0.0, stroke):
        y = float(at.y_of(level))
        painter.drawLine(QPointF(at.box.left(), y), QPointF(at.box.right(), y))


def _snags(painter: QPainter, at: Face, strand: Strand) -> None:
    """A hatched foot under each snag, as the cloth hatches its thread."""
    look = at.look
    for from_s, to_s, _ in strand.snags:
        left, right = float(at.x_of(from_s)), float(at.x_of(to_s))
        wide = max(right - left, look.px(5))
        painter.fillRect(QRectF(left, at.box.bottom() - look.px(9), wide, look.px(9)), look.hatch())
        painter.setPen(pen(look.theme.limit, look.px(1), dash=(2.0, 3.0)))
        painter.drawLine(QPointF(left, at.box.top()), QPointF(left, at.box.bottom()))


def _words(painter: QPainter, at: Face, strand: Strand) -> None:
    """What each snag needs and has, beside it, where there is room."""
    look, px = at.look, at.look.px
    taken = [-np.inf, -np.inf]
    for from_s, to_s, words in strand.snags:
        if to_s < at.from_s or from_s > at.to_s:
            continue
        wide = look.width(words, 11.5) + px(10)
        left = max(min(float(at.x_of(from_s)) + px(4), at.box.right() - wide), at.box.left() + px(2))
        row = next((number for number, end in enumerate(taken) if left >= end), None)
        if row is None:
            continue
        taken[row] = left + wide + px(4)
        box = QRectF(left, at.box.bottom() - px(28) - row * px(19), wide, px(17))
        painter.fillRect(box, colour(look.theme.panel))
        look.write(painter, box.adjusted(px(5), 0, 0, 0), words, 11.5, look.theme.limit, LEFT)


def _curve(
    painter: QPainter, at: Face, when: Array, strain: Array, of: Colour, width: float, dash: tuple[float, ...] = ()
) -> None:
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.setPen(pen(of, width * at.look.scale, dash=dash))
    painter.drawPolyline(_points(at, when, strain))


def _points(at: Face, when: Array, strain: Array) -> QPolygonF:
    return QPolygonF([QPointF(a, b) for a, b in zip(at.x_of(when).tolist(), at.y_of(strain).tolist(), strict=True)])


def _knots(painter: QPainter, at: Face, strand: Strand, chosen: int) -> None:
    knots, look = strand.knots, at.look
    seen = np.flatnonzero((knots.at_s >= at.from_s) & (knots.at_s <= at.to_s))
    if len(seen) <= MOST_KNOTS:
        for knot in seen.tolist():
            place = QPointF(float(at.x_of(knots.at_s[knot])), float(at.y_of(knots.strain[knot])))
            rhomb(painter, place, look.px(4.5), look.theme.hit, look.theme.hit_edge, look.px(1.4))
    if 0 <= chosen < len(knots.segment):
        place = QPointF(float(at.x_of(knots.at_s[chosen])), float(at.y_of(knots.strain[chosen])))
        rhomb(painter, place, look.px(7), look.theme.chosen, look.theme.ground, look.px(2))


def head(painter: QPainter, at: Face, head_s: float) -> None:
    """Draw the play head."""
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    if at.from_s <= head_s <= at.to_s:
        x = float(at.x_of(head_s))
        painter.setPen(pen(at.look.theme.head, at.look.px(1.6)))
        painter.drawLine(QPointF(x, at.box.top()), QPointF(x, at.box.bottom()))


def dragged(painter: QPainter, at: Face, strand: Strand, way: str, was: tuple[float, float], now: tuple[float, float],
            words: str, grid: float, targets: float) -> None:  # fmt: skip
    """Draw a knot under the hand: the grid of what it is moved along, where it was, where it is, and that in words."""
    look, px, theme = at.look, at.look.px, at.look.theme
    painter.setPen(pen(theme.chosen, look.px(1), 90))
    if way != "target":
        for x in at.x_of(grid_lines(strand.tempo, grid, at.from_s, at.to_s, at.per_px, px(8))).tolist():
            if at.box.left() <= x <= at.box.right():
                painter.drawLine(QLineF(x, at.box.top(), x, at.box.bottom()))
    if way != "time":
        stroke = float(strand.abilities.stroke[strand.fiber])
        for share in np.arange(0.0, 1.0 + 1e-9, targets):
            y = float(at.y_of(share * stroke))
            painter.drawLine(QLineF(at.box.left(), y, at.box.right(), y))
    before, here = (QPointF(float(at.x_of(one[0])), float(at.y_of(one[1]))) for one in (was, now))
    painter.setPen(pen(theme.chosen, look.px(1.4), dash=(3.0, 2.0)))
    painter.drawLine(before, here)
    rhomb(painter, before, px(5), theme.panel, theme.chosen, look.px(1.5))
    rhomb(painter, here, px(7), theme.chosen, theme.ground, look.px(2))
    wide = look.width(words, 12, True) + px(12)
    left = min(max(here.x() + px(10), at.box.left()), at.box.right() - wide)
    top = here.y() - px(28) if here.y() - px(28) > at.box.top() else here.y() + px(10)
    box = QRectF(left, top, wide, px(20))
    painter.fillRect(box, colour(theme.raised))
    look.write(painter, box.adjusted(px(6), 0, 0, 0), words, 12, theme.ink, LEFT, bold=True)
