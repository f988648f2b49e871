"""A run's log as a picture: wanted and sensed as cloths one above the other, their distance, and how late ticks came."""

from typing import Any

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QRectF
from PySide6.QtGui import QImage, QPainter

from composer.picture import palette
from composer.picture.axes import second_ticks
from composer.picture.image import colours
from composer.picture.look import CENTRE, LEFT, RIGHT, Look, colour, pen
from player.engine.told import Told, wanted_at

WIDTH, HEIGHT = 1800, 1200
LOOK = Look(1.35)
NEAREST_S = 0.3
"""A column shows the sense nearest to it, if that is no further than so many seconds."""

WORST_SHOWN = 12

Array = NDArray[np.float64]


def paint(painter: QPainter, log: Told, whole: dict[str, Any]) -> None:
    """Draw into WIDTH by HEIGHT pixels; `whole` is the object that the report tells."""
    px = LOOK.px
    painter.fillRect(QRectF(0, 0, WIDTH, HEIGHT), colour(palette.GROUND))
    head = QRectF(px(24), px(12), WIDTH - px(48), px(32))
    wide = LOOK.write(painter, head, str(whole["title"] or whole["played"]), 19, bold=True)
    head.setLeft(head.left() + wide + px(22))
    LOOK.write(painter, head, f"{whole['date']}, {whole['ended']} at {whole['place']}", 13, palette.QUIET_INK)
    left, right = px(92), WIDTH - px(24)
    span = _span(log)
    columns = right - left
    times = span[0] + (np.arange(columns) + 0.5) * (span[1] - span[0]) / columns
    everyone = np.arange(len(log.fibers))
    wanted = wanted_at(log, times, everyone).T
    sensed = _sensed(log, times)
    tall = px(180)
    top = px(80)
    _cloth(painter, QRectF(left, top, columns, tall), "wanted", wanted, False)
    second = top + tall + px(38)
    _cloth(painter, QRectF(left, second, columns, tall), "sensed", sensed, True)
    third = second + tall + px(38)
    lane = QRectF(left, third, columns, px(110))
    _distance(painter, lane, wanted, sensed)
    _seconds(painter, lane, span)
    _faults(painter, log, span, left, columns, top, third + px(110))
    low = third + px(110) + px(66)
    room = HEIGHT - low - px(44)
    _lateness(painter, QRectF(left, low, columns * 0.4, room), whole)
    _worst(painter, QRectF(left + columns * 0.46, low - px(26), columns * 0.54, room + px(26)), whole)


def _span(log: Told) -> tuple[float, float]:
    """From the first set to the last, in s of the engine's clock, at least a second."""
    if not len(log.in_force_s):
        return 0.0, 1.0
    first = float(log.in_force_s[0])
    return first, max(float(log.in_force_s[-1]), first + 1.0)


def _sensed(log: Told, times: Array) -> Array:
    """Shares of stroke (F, T) of the sense nearest to each time, nan where there is none near."""
    share = np.full((len(log.fibers), len(times)), np.nan)
    for part in log.sensed:
        order = np.argsort(part.at_s, kind="stable")
        at = part.at_s[order]
        later = np.clip(np.searchsorted(at, times), 1, max(len(at) - 1, 1))
        if len(at) < 2:
            continue
        near = np.where(times - at[later - 1] < at[later] - times, later - 1, later)
        values = part.share[order][near].T
        values[:, np.abs(at[near] - times) > NEAREST_S] = np.nan
        share[part.fibers] = values
    return share


def _cloth(painter: QPainter, box: QRectF, name: str, share: Array, can_lack: bool) -> None:
    """One row of colour a fiber, as in the preview; where nothing is known the panel shows."""
    LOOK.write(painter, QRectF(box.left(), box.top() - LOOK.px(24), 400, LOOK.px(22)), name, 13)
    painter.fillRect(box, colour(palette.PANEL))
    if not share.size:
        return
    image = colours(share, np.zeros(len(share), dtype=bool))
    image[np.isnan(share)] = palette.PANEL
    image = np.ascontiguousarray(image)
    painter.drawImage(box, QImage(image.data, share.shape[1], share.shape[0], 3 * share.shape[1], QImage.Format.Format_RGB888))
    if can_lack and np.isnan(share).all():
        LOOK.write(painter, box, "nothing was sensed", 13, palette.QUIET_INK, CENTRE)


def _distance(painter: QPainter, box: QRectF, wanted: Array, sensed: Array) -> None:
    """The largest distance of any fiber, column by column."""
    px = LOOK.px
    painter.fillRect(box, colour(palette.PANEL))
    title = "furthest from what was wanted, % of stroke"
    LOOK.write(painter, QRectF(box.left(), box.top() - px(24), box.width(), px(22)), title, 13)
    error = np.abs(sensed - wanted)
    known = np.isfinite(error).any(axis=0) if error.size else np.zeros(0, dtype=bool)
    worst = np.where(known, np.max(np.nan_to_num(error), axis=0, initial=0.0), 0.0)
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


def _seconds(painter: QPainter, box: QRectF, span: tuple[float, float]) -> None:
    px = LOOK.px
    lasts = span[1] - span[0]
    for tick in second_ticks(0.0, lasts, box.width(), px(64)):
        x = box.left() + tick.at / lasts * box.width()
        painter.setPen(pen(palette.LINE))
        painter.drawLine(int(x), int(box.bottom()), int(x), int(box.bottom()) + px(5))
        LOOK.write(painter, QRectF(x - px(40), box.bottom() + px(6), px(80), px(18)), tick.label, 11, palette.QUIET_INK, CENTRE)


def _faults(
    painter: QPainter, log: Told, span: tuple[float, float], left: float, wide: float, top: float, bottom: float
) -> None:
    """A line down through all where something went wrong."""
    painter.setPen(pen(palette.LIMIT, 2.0, dash=(3.0, 2.0)))
    for record in log.happened:
        fault = record.kind == "board" and record.told.get("kind") in ("fault", "lost", "silent")
        if fault or record.kind in ("alarm", "slip"):
            share = min(max((record.time_s - span[0]) / (span[1] - span[0]), 0.0), 1.0)
            x = int(left + share * wide)
            painter.drawLine(x, int(top), x, int(bottom))


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
        words = (one["place"], one["fiber"], f"{100 * one['error']:+.2f}")
        for text, at, wide in zip(words, (0.0, 0.14, 0.32), (0.13, 0.17, 0.1), strict=True):
            where = QRectF(box.left() + at * box.width(), y, wide * box.width(), line)
            LOOK.write(painter, where, text, 12, palette.INK if at else palette.QUIET_INK, RIGHT if at > 0.3 else LEFT)
    faults = whole["faults"]
    x = box.left() + 0.5 * box.width()
    LOOK.write(painter, QRectF(x, box.top(), box.width() * 0.5, px(22)), f"faults: {len(faults) or 'none'}", 13)
    for number, one in enumerate(faults[: min(WORST_SHOWN, room)]):
        where = QRectF(x, box.top() + px(26) + number * line, 0.5 * box.width(), line)
        LOOK.write(painter, where, f"{one['place']}  {one['say'] or one['kind']}", 12, palette.LIMIT)
