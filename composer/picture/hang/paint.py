"""The hang view drawn: what stands still once, the fibers every frame; into a window, a file or a frame of a movie."""

from collections.abc import Collection
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray
from PySide6.QtCore import QLineF, QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QPen, QPolygonF
from shiboken6 import VoidPtr

from composer.limits.abilities import Abilities
from composer.picture import palette
from composer.picture.bands import Band, bands_of
from composer.picture.hang.camera import VIEWS, Camera, depth, extent, fitted, scale_bar
from composer.picture.hang.shapes import Hanging, centre_lines, hanging_of, radii
from composer.picture.image import extends
from composer.picture.look import CENTRE, LEFT, RIGHT, Look, colour, pen
from composer.rig.model import Rig

Array = NDArray[np.float64]

SHADES = 32
"""Steps of brightness, so that fibers alike are drawn with one pen."""

WIDTHS = 0.5
"""Pixels between pens."""

FINE_PX = 0.7
"""Pixels between points of a curve below which some are left out."""

AT_ONCE = 64
"""Lines, or points, that are drawn in one go."""

LAYERS = 6
"""Depths that are told apart when nearer fibers are laid over farther ones."""

APART = 0.02
"""Share of stroke by which what is wanted and what is sensed must differ for a ghost to be drawn."""

NEAR_FLOOR = 0.4
"""A floor lower than this share of the rig's height below it is out of the picture."""

REST_SHADE = 0.34
"""How bright a fiber is at rest, as a share of its ramp: here its place tells how far it has moved, and none may be lost."""


@dataclass(frozen=True, slots=True, eq=False)
class Room:
    """A rig ready to be drawn: its fibers where they hang, `stroke` (F,), which extend, names, bands, and the reach of all;
    floor: whether they stand over one.
    """

    hanging: Hanging
    stroke: Array
    extending: NDArray[np.bool_]
    names: tuple[str, ...]
    bands: tuple[Band, ...]
    reach: Array
    floor: bool


def room_of(rig: Rig, abilities: Abilities) -> Room:
    """The room of a rig."""
    hanging = hanging_of(rig)
    reach = extent(hanging, abilities.stroke)
    floor = _has_floor(reach)
    if floor:
        # The floor belongs to the picture where it is near.
        feet = reach.copy()
        feet[:, 2] = 0.0
        reach = np.concatenate([reach, feet])
    names = tuple(fiber.name for fiber in rig.fibers)
    return Room(hanging, abilities.stroke, extends(abilities), names, bands_of(rig), reach, floor)


def _has_floor(points: Array) -> bool:
    """Whether there is a floor at height 0: nothing lies lower, and it is near beside the rig's own height."""
    if not len(points):
        return False
    low, high = float(points[:, 2].min()), float(points[:, 2].max())
    return low >= -0.005 and low <= NEAR_FLOOR * max(high - low, 0.05)


def camera_of(room: Room, view: str, width: int, height: int, look: Look) -> Camera:
    """The camera that has the whole room in a picture of that size, with margins for its words."""
    side, above, below = look.px(56), look.px(58), look.px(48)
    return fitted(room.reach, VIEWS[view], side, above, max(width - 2 * side, 40), max(height - above - below, 40))


def paint_still(painter: QPainter, room: Room, camera: Camera, look: Look, width: int, height: int) -> None:
    """Draw what does not move: ground, floor, what fibers hang from, where their ends are at rest, the scale bar."""
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    painter.fillRect(0, 0, width, height, colour(look.theme.ground))
    if not len(room.names):
        look.write(painter, QRectF(0, 0, width, height), "no fibers", 14, look.theme.quiet_ink, CENTRE)
        return
    _floor(painter, room, camera, look, width)
    _rests(painter, room, camera, look)
    _bars(painter, room, camera, look, width)
    _scale(painter, camera, look, width, height)


def _floor(painter: QPainter, room: Room, camera: Camera, look: Look, width: int) -> None:
    if not room.floor:
        return
    low, high = room.reach.min(axis=0), room.reach.max(axis=0)
    pad = 0.12 * max(float((high - low).max()), 0.2)
    corners = [(low[0] - pad, low[1] - pad), (high[0] + pad, low[1] - pad), (high[0] + pad, high[1] + pad)]
    corners.append((low[0] - pad, high[1] + pad))
    seen = camera.pixels(np.array([(x, y, 0.0) for x, y in corners]))
    painter.setPen(pen(look.theme.line, max(1.0, look.scale)))
    if camera.view.up_deg:
        painter.setBrush(colour(look.theme.panel))
        painter.drawPolygon(QPolygonF([QPointF(*each) for each in seen]))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        return
    y = float(seen[0, 1])
    painter.drawLine(QPointF(0, y), QPointF(width, y))
    look.write(painter, QRectF(look.px(12), y + look.px(2), look.px(80), look.px(16)), "floor", 11, look.theme.quiet_ink, LEFT)


def _rests(painter: QPainter, room: Room, camera: Camera, look: Look) -> None:
    """Each fiber at rest, faintly, so that every motion is seen against it."""
    painter.setPen(pen(look.theme.faint_line, max(1.0, look.scale)))
    hanging = room.hanging
    lines = camera.pixels(centre_lines(hanging, np.zeros(len(room.names))))
    ends = lines[hanging.first[1:] - 1]
    begins = lines[hanging.first[:-1]]
    painter.drawLines([QLineF(*a, *b) for a, b in zip(begins.tolist(), ends.tolist(), strict=True)])
    size = look.px(3)
    for x, y in ends.tolist():
        painter.drawLine(QPointF(x - size, y), QPointF(x + size, y))


def _bars(painter: QPainter, room: Room, camera: Camera, look: Look, width: int) -> None:
    """A bar through the points from which each band hangs, with its name where there is room."""
    hung = camera.pixels(room.hanging.at)
    painter.setPen(pen(look.theme.line, max(2.0, 2.5 * look.scale)))
    for band in room.bands:
        painter.drawPolyline(_polygon(hung[band.first : band.last]))
    for band, box in band_names(room, camera, look, width):
        look.write(painter, box, band.name, 12, look.theme.quiet_ink, CENTRE)


@lru_cache(maxsize=64)
def band_names(room: Room, camera: Camera, look: Look, width: int) -> tuple[tuple[Band, QRectF], ...]:
    """Where the names of bands of more than one fiber stand, above what they hang from, none over another, a bar or a fiber at
    rest.
    """
    hung = camera.pixels(room.hanging.at)
    bars = [hung[[band.first, band.last - 1]] for band in room.bands]
    taken = [QRectF(QPointF(*ends.min(axis=0)), QPointF(*(ends.max(axis=0) + look.px(3)))) for ends in bars]
    first = room.hanging.first
    lines = camera.pixels(centre_lines(room.hanging, np.zeros(len(room.names))))
    begins, ways = lines[first[:-1]], lines[first[1:] - 1] - lines[first[:-1]]
    # The bar is where they hang: from there a name may stand.
    fibers = np.concatenate([begins + share * ways for share in np.linspace(0.1, 1.0, 10)])
    near = look.px(3)

    def is_free(box: QRectF) -> bool:
        x, y = fibers.T
        over = (x > box.left() - near) & (x < box.right() + near) & (y > box.top() - near) & (y < box.bottom() + near)
        return not over.any() and not any(box.intersects(other) for other in taken)

    placed = []
    for band, ends in zip(room.bands, bars, strict=True):
        if band.last - band.first > 1:
            wide = look.width(band.name, 12) + 4
            x = min(max(ends[:, 0].mean() - wide / 2, 4.0), width - wide - 4.0)
            lowest = box = QRectF(x, ends[:, 1].min() - look.px(24), wide, look.px(17))
            while not is_free(box) and box.top() > 0:
                box = box.translated(0, -look.px(17))
            # Where there is no room all the way up, it stands where it belongs.
            box = box if box.top() > 0 else lowest
            taken.append(box)
            placed.append((band, box))
    return tuple(placed)


def _scale(painter: QPainter, camera: Camera, look: Look, width: int, height: int) -> None:
    length, words = scale_bar(camera.scale, look.px(180))
    right, y = width - look.px(20), height - look.px(16)
    left = right - length * camera.scale
    painter.setPen(pen(look.theme.quiet_ink, max(1.0, 1.5 * look.scale)))
    painter.drawLine(QPointF(left, y), QPointF(right, y))
    for x in (left, right):
        painter.drawLine(QPointF(x, y - look.px(4)), QPointF(x, y + look.px(4)))
    box = QRectF(right - look.px(90), y - look.px(20), look.px(90), look.px(15))
    look.write(painter, box, words, 11.5, look.theme.quiet_ink, RIGHT)


def paint_fibers(
    painter: QPainter,
    room: Room,
    camera: Camera,
    look: Look,
    wanted: ArrayLike,
    sensed: ArrayLike | None = None,
    lit: Collection[int] = (),
) -> Array:
    """Draw the fibers at `sensed` strain (F,), with a pale ghost where `wanted` (F,) differs; without sensed, at `wanted`.

    Returns the pixels (N, 2) of their lines, as `room.hanging` orders them. lit: fibers with a bright outline
    """
    hanging = room.hanging
    wanted = np.nan_to_num(np.asarray(wanted, dtype=float))
    strain = wanted if sensed is None else np.asarray(sensed, dtype=float)
    strain = np.where(np.isfinite(strain), strain, wanted)
    lines = camera.pixels(centre_lines(hanging, strain))
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    apart = np.zeros(0, dtype=np.intp)
    if sensed is not None:
        apart = np.flatnonzero(np.abs(wanted - strain) > APART * room.stroke)
    there = camera.pixels(centre_lines(hanging, wanted)) if len(apart) else lines
    _bent_ghosts(painter, room, look, there, apart)
    _bodies(painter, room, camera, look, strain, lines, lit)
    if len(apart):
        _ghost_ends(painter, room, look, there, lines, apart)
    return lines


def _bent_ghosts(painter: QPainter, room: Room, look: Look, there: Array, which: NDArray[np.intp]) -> None:
    """Where fibers that bend or coil should be, pale and thin, under the fibers; `there` (N, 2): pixels of lines as wanted."""
    first = room.hanging.first
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.setPen(pen(look.theme.ghost, max(1.2, 1.4 * look.scale), 150))
    for fiber in which[room.hanging.bend[which] != 0.0].tolist():
        painter.drawPolyline(_polygon(_thinned(there[first[fiber] : first[fiber + 1]])))


def _ghost_ends(painter: QPainter, room: Room, look: Look, there: Array, here: Array, which: NDArray[np.intp]) -> None:
    """Where ends should be, a bar across, over the fibers; from the end of a straight fiber a thin line leads there."""
    last = room.hanging.first[1:] - 1
    straight = last[which[room.hanging.bend[which] == 0.0]]
    painter.setPen(pen(look.theme.ghost, max(1.2, 1.4 * look.scale), 200))
    _lines(painter, here[straight], there[straight])
    ends = there[last[which]]
    way = ends - there[last[which] - 1]
    way *= look.px(6) / np.maximum(np.hypot(*way.T), 1e-9)[:, None]
    across = np.column_stack([-way[:, 1], way[:, 0]])
    painter.setPen(pen(look.theme.ghost, max(1.8, 2.0 * look.scale), 230))
    _lines(painter, ends - across, ends + across)


def _lines(painter: QPainter, begins: Array, ends: Array) -> None:
    """Draw lines between points (N, 2) and (N, 2), a few at a time: while Qt draws, no other thread has a turn, and a window's
    must not wait long for its keys.
    """
    lines = [QLineF(*each) for each in np.column_stack([begins, ends]).tolist()]
    for first in range(0, len(lines), AT_ONCE):
        painter.drawLines(lines[first : first + AT_ONCE])


def _thinned(points: Array) -> Array:
    """Points (N, 2) of one line, as few as do: a coil that is drawn small has far more than there are pixels."""
    apart = float(np.abs(np.diff(points[:: max(1, len(points) // 16)], axis=0)).max(initial=0.0))
    step = int(FINE_PX * max(1, len(points) // 16) / max(apart, 1e-6))
    return points if step <= 1 else np.concatenate([points[:-1:step], points[-1:]])


def _polygon(points: Array) -> QPolygonF:
    """Points (N, 2) as Qt has them, written where it keeps them, as making each of them would take longer than drawing all."""
    made = QPolygonF()
    made.resize(len(points))
    memory = np.frombuffer(VoidPtr(made.data(), points.size * 8, True), dtype=np.float64)
    memory[:] = points.ravel()
    return made


def _bodies(
    painter: QPainter, room: Room, camera: Camera, look: Look, strain: Array, lines: Array, lit: Collection[int]
) -> None:
    """The fibers themselves, those alike with one pen, the farthest first."""
    hanging = room.hanging
    first = hanging.first
    share = np.clip(strain / np.where(room.stroke > 0.0, room.stroke, 1.0), 0.0, 1.0)
    shade = np.rint((REST_SHADE + (1.0 - REST_SHADE) * share) * (SHADES - 1)).astype(int)
    width = widths(room, camera, look, strain)
    step = np.maximum(np.rint(width / (WIDTHS * look.scale)), 1).astype(int)
    far = LAYERS - 1 - _layers(depth(hanging.at, camera.view))
    # Those alike have one number, that of the farthest the least.
    alike = ((far * 2 + room.extending) * SHADES + shade) * (int(step.max(initial=0)) + 1) + step
    order = np.argsort(alike, kind="stable")
    cuts = np.flatnonzero(np.diff(alike[order])) + 1
    painter.setBrush(Qt.BrushStyle.NoBrush)
    for fiber in sorted(lit):
        if 0 <= fiber < len(room.names):
            painter.setPen(_round(look.theme.chosen, float(width[fiber]) + look.px(5)))
            painter.drawPolyline(_polygon(lines[first[fiber] : first[fiber + 1]]))
    size = look.px(2)
    last = lines[first[1:] - 1]
    bent = hanging.bend != 0.0
    for group in np.split(order, cuts):
        head = group[0]
        ramp = look.theme.extend if room.extending[head] else look.theme.contract
        red, green, blue = ramp[round(shade[head] / (SHADES - 1) * (palette.STEPS - 1))].tolist()
        wide = float(step[head] * WIDTHS * look.scale)
        straight = group[~bent[group]]
        if len(straight):
            # Flat at their ends, as Qt has a quicker way for such lines; the bar is over one end and the bead over the other.
            painter.setPen(_flat((red, green, blue), wide))
            _lines(painter, lines[first[straight]], last[straight])
        if len(straight) < len(group):
            painter.setPen(_round((red, green, blue), wide))
            for fiber in group[bent[group]].tolist():
                painter.drawPolyline(_polygon(_thinned(lines[first[fiber] : first[fiber + 1]])))
        # A bead at the end, so that a small motion is seen where it is largest.
        painter.setPen(_round((red, green, blue), wide + 2 * size))
        for some in range(0, len(group), AT_ONCE):
            painter.drawPoints(_polygon(last[group[some : some + AT_ONCE]]))


def _layers(deep: Array) -> NDArray[np.int64]:
    """Which of a few layers each fiber lies in by its depth (F,), 0 the nearest."""
    low, high = float(deep.min()), float(deep.max())
    if high - low < 1e-6:
        return np.zeros(len(deep), dtype=np.int64)
    return np.rint((deep - low) / (high - low) * (LAYERS - 1)).astype(np.int64)


def widths(room: Room, camera: Camera, look: Look, strain: Array) -> Array:
    """How wide fibers are drawn, (F,) pixels: as they are, or wide enough to be seen where that is more, in one proportion."""
    true = 2.0 * radii(room.hanging, strain) * camera.scale
    thinnest = float((2.0 * room.hanging.radius * camera.scale).min(initial=np.inf))
    least = 3.0 * look.scale
    return true * max(1.0, least / thinnest) if np.isfinite(thinnest) and thinnest > 0.0 else true


@lru_cache(maxsize=4096)
def _flat(of: palette.Colour, width: float) -> QPen:
    return pen(of, width)


@lru_cache(maxsize=4096)
def _round(of: palette.Colour, width: float) -> QPen:
    made = pen(of, width)
    made.setCapStyle(Qt.PenCapStyle.RoundCap)
    made.setJoinStyle(Qt.PenJoinStyle.RoundJoin)
    return made
