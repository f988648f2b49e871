"""A piece as moving pictures: the hang view above, a thin cloth with the play head below, drawn frame by frame."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, QRect, QRectF
from PySide6.QtGui import QImage, QPainter

from composer.motion import Cursor
from composer.picture import palette
from composer.picture.axes import bar_ticks, say_seconds
from composer.picture.cloth.still import qimage
from composer.picture.hang import paint as hang_paint
from composer.picture.hang.camera import Camera
from composer.picture.hang.paint import Room
from composer.picture.image import column_times, extends, rows_of, threads
from composer.picture.look import CENTRE, LEFT, RIGHT, Look, colour, pen
from composer.picture.material import Piece
from composer.picture.palette import Theme
from composer.picture.png import ready
from composer.simulate.kept import Kept
from composer.simulate.run import DEFAULT_HZ, Block, blocks

Array = NDArray[np.float64]

TICKS = 400
"""Ticks between two words on how far the run is."""

MOST_KEPT = 1 << 26
"""Strains kept at most, 4 bytes each: fibers times frames."""


@dataclass(frozen=True, slots=True)
class Take:
    """What of a piece is shown, and how: from `from_s` to `to_s`, a frame every 1 / `fps` s, sizes in pixels."""

    from_s: float
    to_s: float
    fps: float
    width: int
    height: int
    view: str = "front"

    @property
    def frames(self) -> int:
        """How many frames there are: the last shows the end, or just before."""
        return int(np.floor((self.to_s - self.from_s) * self.fps + 1e-6)) + 1

    def time_s(self, frame: int) -> float:
        """The instant that a frame shows, s."""
        return self.from_s + frame / self.fps


@dataclass(frozen=True, slots=True, eq=False)
class Strains:
    """What a movie shows: strain (F, frames) simulated, and (F, W) by column of its cloth."""

    frames: NDArray[np.float32]
    cloth: NDArray[np.float32]


@dataclass(frozen=True, slots=True)
class Plan:
    """Where things are in a frame, in pixels."""

    look: Look
    head: QRect
    hang: QRect
    bars: QRect
    cloth: QRect


def plan_of(take: Take, theme: Theme = palette.DARK) -> Plan:
    """The layout of a frame: a line of words, the hang view, the bars, the cloth along the foot."""
    scale = min(take.width / 1280.0, take.height / 720.0)
    look = Look(max(scale, 0.6), theme)
    side = look.px(20)
    head, bars = look.px(46), look.px(24)
    cloth = max(round(take.height * 0.17), 24)
    foot = look.px(14)
    top = take.height - foot - cloth
    return Plan(
        look,
        QRect(0, 0, take.width, head),
        QRect(0, head, take.width, top - bars - head),
        QRect(side, top - bars, take.width - 2 * side, bars),
        QRect(side, top, take.width - 2 * side, cloth),
    )


class Keeping:
    """Watches a run: `add` every block in order; then `strains` are what the frames and the cloth of a take show."""

    def __init__(self, piece: Piece, take: Take):
        columns = column_times(take.from_s, max(take.to_s, take.from_s + 1e-3), plan_of(take).cloth.width())
        self._frames = Kept(np.array([take.time_s(n) for n in range(take.frames)]), piece.abilities.stroke)
        self._cloth = Kept(columns, piece.abilities.stroke)

    def add(self, block: Block) -> None:
        """Take in the next ticks."""
        self._frames.add(block)
        self._cloth.add(block)

    @property
    def strains(self) -> Strains:
        """What was kept."""
        return Strains(self._frames.strain, self._cloth.strain)


def simulated(
    piece: Piece,
    take: Take,
    rate_Hz: float = DEFAULT_HZ,
    inverse: bool = True,
    progress: Callable[[float], None] = lambda share: None,
) -> Strains:
    """Play a piece on the simulated rig up to the take's end and keep what it shows. progress: the share done, 0 to 1"""
    keeping = Keeping(piece, take)
    ticks = TICKS * max(1, piece.tracks.fibers)
    for block in blocks(piece.tracks, piece.rig, piece.abilities, rate_Hz, inverse, values=ticks):
        keeping.add(block)
        progress(min(1.0, float(block.time_s[-1]) / max(take.to_s, 1e-3)))
        if float(block.time_s[-1]) >= take.to_s:
            break
    return keeping.strains


def look_room(plan: Plan) -> int:
    """Pixels round the cloth that the play head may reach into."""
    return plan.look.px(8)


class Film:
    """Draws the frames of a take. What stands still is drawn once; `frame` lays over it what moves."""

    def __init__(self, piece: Piece, take: Take, strains: Strains, theme: Theme = palette.DARK):
        ready()
        self.take = take
        self._piece, self._strains = piece, strains
        self._plan = plan_of(take, theme)
        self._room: Room = hang_paint.room_of(piece.rig, piece.abilities)
        self._camera: Camera = hang_paint.camera_of(
            self._room, take.view, self._plan.hang.width(), self._plan.hang.height(), self._plan.look
        )
        self._still = self._drawn_still()
        self._frame = self._still.copy()
        self._wanted = Cursor(piece.tracks, piece.abilities)

    def frame(self, number: int) -> QImage:
        """The picture of one frame, the same image every time, drawn anew: take what is wanted of it before the next."""
        plan, at_s = self._plan, self.take.time_s(number)
        painter = QPainter(self._frame)
        room = look_room(plan)
        for box in (plan.head, plan.hang, plan.bars.united(plan.cloth).adjusted(-room, 0, room, room)):
            painter.drawImage(box, self._still, box)
        painter.save()
        painter.setClipRect(plan.hang)
        painter.translate(plan.hang.topLeft())
        hang_paint.paint_fibers(
            painter, self._room, self._camera, plan.look, self._wanted.at(at_s)[0], self._strains.frames[:, number]
        )
        painter.restore()
        self._paint_head(painter, at_s)
        painter.end()
        return self._frame

    def _paint_head(self, painter: QPainter, at_s: float) -> None:
        plan, look, take = self._plan, self._plan.look, self.take
        share = (at_s - take.from_s) / max(take.to_s - take.from_s, 1e-9)
        x = plan.cloth.left() + share * plan.cloth.width()
        painter.setPen(pen(look.theme.ground, look.px(5)))
        top, foot = plan.bars.bottom() - look.px(5), plan.cloth.bottom() + look.px(4)
        painter.drawLine(QPointF(x, top), QPointF(x, foot))
        painter.setPen(pen(look.theme.head, look.px(2)))
        painter.drawLine(QPointF(x, top), QPointF(x, foot))
        bar, _, count = self._piece.tempo.say_place(at_s + 1e-6).partition(":")
        place = f"{bar} : {int(float(count))}"
        box = QRectF(plan.head).adjusted(0, 0, -look.px(20), 0)
        look.write(painter, box, say_seconds(at_s, 1), 16, look.theme.quiet_ink, RIGHT)
        look.write(painter, box.adjusted(0, 0, -look.px(100), 0), place, 20, look.theme.ink, RIGHT, bold=True)

    def _drawn_still(self) -> QImage:
        plan, look, take, piece = self._plan, self._plan.look, self.take, self._piece
        picture = QImage(take.width, take.height, QImage.Format.Format_RGB32)
        painter = QPainter(picture)
        painter.fillRect(0, 0, take.width, take.height, colour(look.theme.ground))
        painter.save()
        painter.translate(plan.hang.topLeft())
        hang_paint.paint_still(painter, self._room, self._camera, look, plan.hang.width(), plan.hang.height())
        painter.restore()
        box = QRectF(plan.head).adjusted(look.px(20), 0, -look.px(260), 0)
        used = look.write(painter, box, piece.title, 20, look.theme.ink, LEFT, bold=True)
        told = "simulated, retimed" if piece.retimed else "simulated, as written"
        look.write(painter, box.adjusted(used + look.px(14), look.px(2), 0, 0), told, 14, look.theme.quiet_ink, LEFT)
        self._draw_cloth(painter)
        painter.end()
        return picture

    def _draw_cloth(self, painter: QPainter) -> None:
        plan, look, take, piece = self._plan, self._plan.look, self.take, self._piece
        room = self._room
        rows = rows_of(room.bands, plan.cloth.height())
        share = self._strains.cloth / np.where(room.stroke > 0.0, room.stroke, 1.0)[:, None]
        pixels = threads(share, extends(piece.abilities), rows, look.theme)
        if pixels.size:
            painter.drawImage(QRect(plan.cloth.topLeft(), plan.cloth.size()), qimage(pixels))
        width = plan.cloth.width()
        for tick in bar_ticks(piece.tempo, take.from_s, take.to_s, width, look.px(34), look.px(12)):
            x = plan.cloth.left() + (tick.at - take.from_s) / (take.to_s - take.from_s) * width
            foot = plan.bars.bottom()
            painter.setPen(pen(look.theme.quiet_ink if tick.strong else look.theme.line, max(1.0, look.scale)))
            painter.drawLine(QPointF(x, foot - look.px(5 if tick.label else 3)), QPointF(x, foot))
            if tick.label and tick.strong:
                box = QRectF(x - look.px(30), plan.bars.top(), look.px(60), plan.bars.height() - look.px(6))
                look.write(painter, box, tick.label, 12, look.theme.quiet_ink, CENTRE)
