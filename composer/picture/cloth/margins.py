"""What lies round the threads of a living cloth: bars, pins and cues above, names beside, lanes below."""

from functools import lru_cache

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QPolygonF

from composer.picture.cloth import lanes
from composer.picture.cloth import still as cloth
from composer.picture.cloth.heading import scene_of
from composer.picture.cloth.over import Shown
from composer.picture.cloth.view import View
from composer.picture.image import Rows
from composer.picture.look import LEFT, RIGHT, colour, pen

UPPER, LOWER = "\u2580", "\u2584"
"""Half blocks: which half of a thread a word is for."""


def around(painter: QPainter, view: View, shown: Shown) -> None:
    """Draw the headings above, the names beside and the lanes below."""
    scene, plan, look = scene_of(view, shown.weave), view.plan, view.look
    rows = Rows(view.shown, view.rows.top, view.rows.bottom, view.rows.crowded)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    cloth.bars(painter, plan, rows, scene)
    if shown.ghost is not None:
        _which(painter, view, shown)
    _names(painter, view, shown)
    painter.save()
    painter.setClipRect(QRectF(plan.left - look.px(6), 0, plan.width + look.px(20), view.height))
    cloth.pins(painter, plan, rows, scene)
    cloth.cues(painter, plan, rows, scene)
    painter.restore()
    if view.lanes_height:
        lanes.paint(painter, look, scene, plan.left, view.lanes_top, plan.width, view.lanes_height)


def _which(painter: QPainter, view: View, shown: Shown) -> None:
    """What the two halves of a thread are."""
    look, plan = view.look, view.plan
    for row, (word, of) in enumerate(zip(shown.words, (look.theme.ink, look.theme.ghost), strict=True)):
        box = QRectF(look.px(8), plan.cues_top + row * look.px(16), plan.left - look.px(12), look.px(16))
        look.write(painter, box, f"{UPPER if row == 0 else LOWER} {word}", 11.5, of, LEFT)


def _names(painter: QPainter, view: View, shown: Shown) -> None:
    """Names of bands beside a bracket, of fibers where there is room, the one that the keys are on always."""
    look, plan, weave = view.look, view.plan, shown.weave
    line, top, foot = look.px(13), plan.top, plan.top + view.shown
    narrow = plan.left < look.px(140)
    split = look.px(10) if narrow else max(look.px(24), plan.left - look.px(13) - look.width(_longest(weave.names), 11, True))
    painter.save()
    painter.setClipRect(QRectF(0, top - look.px(2), plan.left, view.shown + look.px(4)))
    shown_fibers = view.fibers_shown()
    taken = -np.inf
    for band in weave.bands:
        if band.last <= shown_fibers.start or band.first >= shown_fibers.stop:
            continue
        begin, end = max(view.y_of(band.first)[0], top), min(view.y_of(band.last - 1)[1], foot)
        painter.setPen(pen(look.theme.edge, look.px(2)))
        x = plan.left - look.px(5)
        painter.drawLine(QPointF(x, begin), QPointF(x, end))
        high = view.rows.bottom[band.first] - view.rows.top[band.first]
        single = high >= line
        if single:
            for fiber in range(max(band.first, shown_fibers.start), min(band.last, shown_fibers.stop)):
                upper, lower = view.y_of(fiber)
                chosen = fiber == shown.fiber
                box = QRectF(split, (upper + lower - line) / 2, plan.left - look.px(11) - split, line)
                of = look.theme.chosen if chosen else look.theme.quiet_ink
                look.write(painter, box, weave.names[fiber], 11, of, RIGHT, bold=chosen)
        middle = (begin + end) / 2
        if middle - line / 2 >= taken and not (single and (narrow or band.last - band.first == 1)):
            room = split - look.px(12) if single else plan.left - look.px(18)
            look.write(
                painter, QRectF(look.px(8), middle - line / 2, room, line), band.name, 11.5, look.theme.ink, LEFT, bold=True
            )
            taken = middle + line / 2
    if shown.fiber is not None and shown.fiber in shown_fibers:
        upper, lower = view.y_of(shown.fiber)
        middle, size = (upper + lower) / 2, look.px(4)
        if lower - upper < line:
            box = QRectF(0, middle - line * 0.6, plan.left, line * 1.2)
            painter.fillRect(box, colour(look.theme.raised))
            box.adjust(look.px(8), 0, -look.px(14), 0)
            look.write(painter, box, weave.names[shown.fiber], 11, look.theme.chosen, RIGHT, bold=True)
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(colour(look.theme.chosen))
        x = plan.left - look.px(8)
        painter.drawPolygon(QPolygonF([QPointF(x, middle - size), QPointF(x + 2 * size, middle), QPointF(x, middle + size)]))
    painter.restore()


@lru_cache(maxsize=4)
def _longest(names: tuple[str, ...]) -> str:
    return max(names, key=len, default="")
