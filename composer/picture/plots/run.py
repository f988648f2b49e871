"""A run as it was, as a picture: wanted and sensed as cloths one above the other, their distance, and how late ticks came."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QRectF
from PySide6.QtGui import QImage, QPainter

from composer.picture import palette
from composer.picture.axes import second_ticks
from composer.picture.image import colours
from composer.picture.look import CENTRE, LEFT, RIGHT, Look, colour, pen

WIDTH, HEIGHT = 1800, 1200
LOOK = Look(1.35)
LEFT_PX = LOOK.px(92)
COLUMNS = WIDTH - LOOK.px(24) - LEFT_PX
"""Columns of the cloths: an instant each."""

WORST_SHOWN = 12

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class RunScene:
    """A run of `lasts_s`: shares of stroke wanted and sensed (F, COLUMNS), nan where not known; marks_s: what went wrong when.

    extends: (F,) which fibers lengthen when they fill; fibers: their names
    apart: the largest distance of any fiber (COLUMNS,), each sense against the want of its own instant; nan: not known
    told: the object of the run's report
    """

    lasts_s: float
    wanted: Array
    sensed: Array
    apart: Array
    marks_s: tuple[float, ...]
    told: dict[str, Any]
    extends: NDArray[np.bool_]
    fibers: tuple[str, ...]


def paint(painter: QPainter, scene: RunScene) -> None:
    """Draw into WIDTH by HEIGHT pixels."""
    px, whole = LOOK.px, scene.told
    painter.fillRect(QRectF(0, 0, WIDTH, HEIGHT), colour(palette.GROUND))
    head = QRectF(px(24), px(12), WIDTH - px(48), px(32))
    wide = LOOK.write(painter, head, str(whole["title"] or whole["played"]), 19, bold=True)
    head.setLeft(head.left() + wide + px(22))
    LOOK.write(painter, head, f"{whole['date']}, {whole['ended']} at {whole['place']}", 13, palette.QUIET_INK)
    tall, top = px(180), px(80)
    _cloth(painter, QRectF(LEFT_PX, top, COLUMNS, tall), "wanted", scene.wanted, scene, False)
    second = top + tall + px(38)
    _cloth(painter, QRectF(LEFT_PX, second, COLUMNS, tall), "sensed", scene.sensed, scene, True)
    third = second + tall + px(38)
    lane = QRectF(LEFT_PX, third, COLUMNS, px(110))
    _distance(painter, lane, scene.apart)
    _seconds(painter, lane, scene.lasts_s)
    painter.setPen(pen(palette.LIMIT, 2.0, dash=(3.0, 2.0)))
    for at_s in scene.marks_s:
        x = int(LEFT_PX + min(max(at_s / scene.lasts_s, 0.0), 1.0) * COLUMNS)
        painter.drawLine(x, int(top), x, int(third + px(110)))
    low = third + px(110) + px(66)
    room = HEIGHT - low - px(44)
    _lateness(painter, QRectF(LEFT_PX, low, COLUMNS * 0.4, room), whole)
    _worst(painter, QRectF(LEFT_PX + COLUMNS * 0.46, low - px(26), COLUMNS * 0.54, room + px(26)), whole)


def _cloth(painter: QPainter, box: QRectF, name: str, share: Array, scene: RunScene, can_lack: bool) -> None:
    """One row of colour a fiber, as in the preview; where nothing is known the panel shows."""
    LOOK.write(painter, QRectF(box.left(), box.top() - LOOK.px(24), 400, LOOK.px(22)), name, 13)
    painter.fillRect(box, colour(palette.PANEL))
    if not share.size:
        return
    image = colours(share, scene.extends)
    image[np.isnan(share)] = palette.PANEL
    image = np.ascontiguousarray(image)
    painter.drawImage(box, QImage(image.data, share.shape[1], share.shape[0], 3 * share.shape[1], QImage.Format.Format_RGB888))
    _rows(painter, box, scene.fibers)
    if can_lack and np.isnan(share).all():
        LOOK.write(painter, box, "nothing was sensed", 13, palette.QUIET_INK, CENTRE)


def _rows(painter: QPainter, box: QRectF, fibers: tuple[str, ...]) -> None:
    """To the left the name of each row of fibers, where it stands; one that has no room is left out."""
    px = LOOK.px
    tall = box.height() / len(fibers)
    stems = [fiber.rpartition(".")[0] or fiber for fiber in fibers]
    starts = [n for n in range(len(stems)) if n == 0 or stems[n] != stems[n - 1]]
    free = box.top()
    for start, end in zip(starts, [*starts[1:], len(stems)], strict=True):
        if start:
            y = int(box.top() + start * tall)
            painter.setPen(pen(palette.LINE))
            painter.drawLine(int(box.left() - px(6)), y, int(box.left()), y)
        middle = box.top() + 0.5 * (start + end) * tall
        if middle - px(7) >= free:
            LOOK.write(
                painter, QRectF(px(4), middle - px(9), box.left() - px(12), px(18)), stems[start], 11, palette.QUIET_INK, RIGHT
            )
            free = middle + px(7)


def _distance(painter: QPainter, box: QRectF, apart: Array) -> None:
    """The largest distance of any fiber, column by column."""
    px = LOOK.px
    painter.fillRect(box, colour(palette.PANEL))
    title = "furthest from what was wanted, % of stroke"
    LOOK.write(painter, QRectF(box.left(), box.top() - px(24), box.width(), px(22)), title, 13)
    known = np.isfinite(apart)
    worst = np.nan_to_num(apart)
    most = max(0.02, float(worst.max(initial=0.0)) * 1.1)
    step = next(one for one in (0.01, 0.02, 0.05, 0.1, 0.2, 0.5, 1.0) if most / one <= 5.0 or one == 1.0)
    for level in np.arange(0.0, most, step):
        y = box.bottom() - level / most * box.height()
        painter.setPen(pen(palette.FAINT_LINE))
        painter.drawLine(int(box.left()), int(y), int(box.right()), int(y))
        LOOK.write(
            painter, QRectF(box.left() - px(60), y - px(9), px(54), px(18)), f"{100 * level:g}", 11, palette.QUIET_INK, RIGHT
        )
    painter.setPen(pen(palette.MISS, 1.4))
    for column in np.flatnonzero(known):
        x = int(box.left()) + int(column)
        painter.drawLine(x, int(box.bottom()), x, int(box.bottom() - worst[column] / most * box.height()))


def _seconds(painter: QPainter, box: QRectF, lasts: float) -> None:
    px = LOOK.px
    for tick in second_ticks(0.0, lasts, box.width(), px(64)):
        x = box.left() + tick.at / lasts * box.width()
        painter.setPen(pen(palette.LINE))
        painter.drawLine(int(x), int(box.bottom()), int(x), int(box.bottom()) + px(5))
        LOOK.write(painter, QRectF(x - px(40), box.bottom() + px(6), px(80), px(18)), tick.label, 11, palette.QUIET_INK, CENTRE)


def _lateness(painter: QPainter, box: QRectF, whole: dict[str, Any]) -> None:
    """How many ticks came how late, on a scale by tens, so that a single one is seen beside ten thousand."""
    px = LOOK.px
    title = f"ticks by how late they came, ms (latest {whole['latest_ms']:.2f})"
    LOOK.write(painter, QRectF(box.left(), box.top() - px(26), box.width(), px(22)), title, 13)
    painter.fillRect(box, colour(palette.PANEL))
    counts = [one["ticks"] for one in whole["lateness"]]
    most = max(1.0, np.log10(max(counts, default=0) + 1.0) * 1.15)
    slot = box.width() / max(len(counts), 1)
    for number, one in enumerate(whole["lateness"]):
        tall = np.log10(one["ticks"] + 1.0) / most * box.height()
        bar = QRectF(box.left() + number * slot + slot * 0.15, box.bottom() - tall, slot * 0.7, tall)
        painter.fillRect(bar, colour(palette.DUTY))
        label = "more" if one["to_ms"] is None else f"{one['to_ms']:g}"
        LOOK.write(
            painter,
            QRectF(bar.left() - slot * 0.2, box.bottom() + px(4), slot * 1.1, px(18)),
            label,
            10.5,
            palette.QUIET_INK,
            CENTRE,
        )
        if one["ticks"]:
            words = QRectF(bar.left() - slot * 0.3, bar.top() - px(18), slot * 1.3, px(18))
            LOOK.write(painter, words, str(one["ticks"]), 10.5, palette.INK, CENTRE)


def _worst(painter: QPainter, box: QRectF, whole: dict[str, Any]) -> None:
    """The landings that were furthest off, or the faults where no landing was sensed."""
    px = LOOK.px
    line = px(21)
    hits = whole["hits"]
    title = f"landings furthest off, of {len(hits)} (% of stroke)" if hits else "no landing was sensed"
    LOOK.write(painter, QRectF(box.left(), box.top(), box.width() * 0.5, px(22)), title, 13)
    room = max(0, int((box.height() - px(26)) // line))
    for number, one in enumerate(hits[: min(WORST_SHOWN, room)]):
        y = box.top() + px(26) + number * line
        percent = 100 * one["error"]
        words = (one["place"], one["fiber"], f"{percent:+.2f}" if abs(percent) >= 0.005 else "0.00")
        for text, at, wide in zip(words, (0.0, 0.14, 0.32), (0.13, 0.17, 0.1), strict=True):
            where = QRectF(box.left() + at * box.width(), y, wide * box.width(), line)
            LOOK.write(painter, where, text, 12, palette.INK if at else palette.QUIET_INK, RIGHT if at > 0.3 else LEFT)
    faults = whole["faults"]
    x = box.left() + 0.5 * box.width()
    LOOK.write(painter, QRectF(x, box.top(), box.width() * 0.5, px(22)), f"faults: {len(faults) or 'none'}", 13)
    for number, one in enumerate(faults[: min(WORST_SHOWN, room)]):
        where = QRectF(x, box.top() + px(26) + number * line, 0.5 * box.width(), line)
        LOOK.write(painter, where, f"{one['place']}  {one['say'] or one['kind']}", 12, palette.LIMIT)
