"""What lies round and over the threads of a living cloth: names, snags, hits, what is chosen, what would be instead."""

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QLineF, QPointF, QRectF, Qt
from PySide6.QtGui import QImage, QPainter, QPolygonF

from composer.picture.cloth import still as cloth
from composer.picture.cloth.heading import scene_of
from composer.picture.cloth.hits import Hits, in_view, moved_hits
from composer.picture.cloth.sampling import SPLIT_FROM
from composer.picture.cloth.view import View
from composer.picture.cloth.weave import Weave
from composer.picture.image import Rows
from composer.picture.look import LEFT, colour, pen
from composer.picture.scene import Stretch
from composer.tracks import Tracks

Array = NDArray[np.float64]

MOST_HITS = 1500
"""Hits that are shown at once; where there are more, marks would cover the threads."""
HIT_FROM = 9
"""Pixels, at scale 1, that a thread has at least where hits are shown."""
MOST_MARKS = 4000
"""Marks of one kind drawn in one frame at most; beyond that, those that share pixels are drawn once."""

HEAD_PX = 5
"""Half the width of the play head's foot, at scale 1: nothing of a head lies further from its instant."""


@dataclass(frozen=True, slots=True, eq=False)
class Shown:
    """All that is drawn round and over the threads, beside the weave itself.

    marks: of the snags, (N,) each: fiber, -1 for the air's, from and to in s
    selected: what `frames_of` made of lit stretches; lit: segments that move together
    snag, hit: indices of what is chosen, -1 for none
    fiber: the thread that the keys are on, None for none; ghost: tracks that would be instead, with the words for both
    """

    weave: Weave
    hits: Hits
    marks: tuple[NDArray[np.int64], Array, Array]
    selected: tuple[NDArray[np.int64], NDArray[np.int64], Array, Array] | None = None
    lit: NDArray[np.int64] = field(default_factory=lambda: np.empty(0, dtype=np.int64))
    snag: int = -1
    hit: int = -1
    fiber: int | None = None
    ghost: Tracks | None = None
    words: tuple[str, str] = ("as written", "retimed")


def marks_of(snags: Sequence[Stretch]) -> tuple[NDArray[np.int64], Array, Array]:
    """Snags as arrays, to be looked through at every frame."""
    fiber = np.array([-1 if snag.fiber is None else snag.fiber for snag in snags], dtype=np.int64)
    begin, end = (np.array([getattr(snag, name) for snag in snags], dtype=float) for name in ("from_s", "to_s"))
    return fiber, begin, end


def over(painter: QPainter, view: View, shown: Shown) -> None:
    """Draw what lies over the threads: what is chosen, snags, ghosts, hits."""
    plan = view.plan
    painter.save()
    painter.setClipRect(QRectF(plan.left, plan.strip_top, plan.width, plan.top + view.shown - plan.strip_top))
    rows = Rows(view.shown, view.rows.top, view.rows.bottom, view.rows.crowded)
    scene = scene_of(view, shown.weave, lanes_too=False)
    cloth.bar_lines_over(painter, plan, rows, scene)
    cloth.cues(painter, plan, rows, scene)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
    _snag_strip(painter, view, shown)
    painter.setClipRect(QRectF(plan.left, plan.top, plan.width, view.shown))
    _snags(painter, view, shown)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    _selected(painter, view, shown)
    if shown.ghost is not None:
        _moved(painter, view, shown)
    _lit(painter, view, shown)
    _hits(painter, view, shown)
    painter.restore()
    if shown.ghost is not None:
        _moved_strip(painter, view, shown)


def _snag_strip(painter: QPainter, view: View, shown: Shown) -> None:
    """A strip above the cloth that shows when there is any snag of a fiber."""
    if not len(shown.marks[0]):
        return
    look = view.look
    fiber, begin, end = shown.marks
    seen = (fiber >= 0) & (end >= view.from_s) & (begin <= view.to_s)
    left, right = _spans(view, begin[seen], end[seen], look.px(cloth.LEAST_MARK))
    painter.setPen(Qt.PenStyle.NoPen)
    painter.setBrush(colour(look.theme.limit))
    top, high = view.plan.strip_top + look.px(2), look.px(5)
    painter.drawRects([QRectF(a, top, b - a, high) for a, b in _joined(left, right)])


def _snags(painter: QPainter, view: View, shown: Shown) -> None:
    """A hatch over each snag of a fiber."""
    snags = shown.weave.snags
    if not snags:
        return
    look, plan = view.look, view.plan
    least = look.px(cloth.LEAST_MARK)
    fiber, begin, end = shown.marks
    seen = (fiber >= 0) & (end >= view.from_s) & (begin <= view.to_s)
    left, right = _spans(view, begin, end, least)
    fibers = view.fibers_shown()
    seen &= (fiber >= fibers.start) & (fiber < fibers.stop)
    which = np.flatnonzero(seen)
    shift = plan.top - view.scroll
    top, bottom = view.rows.top[fiber[which]] + shift, view.rows.bottom[fiber[which]] + shift
    thin = bottom - top < least
    middle = (top + bottom) / 2
    top, bottom = np.where(thin, middle - least / 2, top), np.where(thin, middle + least / 2, bottom)
    boxes = np.stack([left[which], top, right[which] - left[which], bottom - top], axis=1)
    if len(boxes) > MOST_MARKS:
        _, kept = np.unique(np.round(boxes[:, :3] / least), axis=0, return_index=True)
        boxes = boxes[kept[:MOST_MARKS]]
    painter.setPen(Qt.PenStyle.NoPen)
    painter.setBrush(look.hatch())
    painter.drawRects([QRectF(*box) for box in boxes.tolist()])
    if 0 <= shown.snag < len(snags) and snags[shown.snag].fiber is not None:
        _frame(painter, view, snags[shown.snag], look.px(3))


def _spans(view: View, begin_s: Array, end_s: Array, least: float) -> tuple[Array, Array]:
    """Pixel columns of stretches, each at least `least` wide, cut a little beyond the window."""
    far = 50.0
    scale = view.plan.width / (view.to_s - view.from_s)
    left, right = (
        np.clip(view.plan.left + (at - view.from_s) * scale, view.plan.left - far, view.plan.left + view.plan.width + far)
        for at in (begin_s, end_s)
    )
    short = np.maximum(least - (right - left), 0.0) / 2
    return left - short, right + short


def _joined(left: Array, right: Array) -> list[tuple[float, float]]:
    """Spans that touch as one, so that a thousand of them on end are one box."""
    if not len(left):
        return []
    order = np.argsort(left)
    left, reach = left[order], np.maximum.accumulate(right[order])
    cut = np.flatnonzero(left[1:] > reach[:-1] + 1.0) + 1
    return list(zip(left[np.r_[0, cut]].tolist(), reach[np.r_[cut - 1, len(left) - 1]].tolist(), strict=True))


def frames_of(stretches: Sequence[Stretch]) -> tuple[NDArray[np.int64], NDArray[np.int64], Array, Array] | None:
    """Lit stretches as frames: first and last fiber, from and to in s, (N,) each; None where none is of a fiber.

    Fibers side by side that share a stretch share a frame.
    """
    fiber, begin, end = marks_of(stretches)
    order = np.lexsort((fiber, end, begin))
    order = order[fiber[order] >= 0]
    fiber, begin, end = fiber[order], begin[order], end[order]
    if not len(order):
        return None
    apart = (begin[1:] != begin[:-1]) | (end[1:] != end[:-1]) | (fiber[1:] != fiber[:-1] + 1)
    first = np.concatenate([[0], np.flatnonzero(apart) + 1])
    last = np.concatenate([first[1:] - 1, [len(fiber) - 1]])
    return fiber[first], fiber[last], begin[first], end[first]


def _selected(painter: QPainter, view: View, shown: Shown) -> None:
    """Frames round what is lit, dark outside so that they are seen on bright threads too."""
    if shown.selected is None:
        return
    look, shift = view.look, view.plan.top - view.scroll
    first, last, begin, end = shown.selected
    fibers = view.fibers_shown()
    seen = (end >= view.from_s) & (begin <= view.to_s) & (last >= fibers.start) & (first < fibers.stop)
    first, last = first[seen], last[seen]
    left, right = _spans(view, begin[seen], end[seen], look.px(6))
    top = view.rows.top[first] + shift
    high = np.maximum(view.rows.bottom[last] + shift - top, look.px(4))
    boxes = np.stack([left, top, right - left, high], axis=1)[:MOST_MARKS]
    _framed(painter, view, [QRectF(*box) for box in boxes.tolist()], look.px(2))


def _frame(painter: QPainter, view: View, stretch: Stretch, width: int) -> None:
    """A frame round a stretch of a thread."""
    look = view.look
    assert stretch.fiber is not None
    left, right = (float(one[0]) for one in _spans(view, np.array([stretch.from_s]), np.array([stretch.to_s]), look.px(6)))
    top, bottom = view.y_of(stretch.fiber)
    _framed(painter, view, [QRectF(left, top, right - left, max(bottom - top, look.px(4)))], width)


def _framed(painter: QPainter, view: View, boxes: list[QRectF], width: float) -> None:
    painter.setBrush(Qt.BrushStyle.NoBrush)
    for of, wide in ((view.look.theme.ground, width + view.look.px(2)), (view.look.theme.chosen, width)):
        painter.setPen(pen(of, wide))
        painter.drawRects(boxes)


def _visible_segments(view: View, tracks: Tracks, segments: NDArray[np.int64]) -> tuple[NDArray[np.int64], Array, Array, Array]:
    """Those segments that are in view: fiber, begin, end in s, and themselves."""
    fiber = np.searchsorted(tracks.first, segments, side="right") - 1
    begin = tracks.time_s[segments]
    end = tracks.time_s[np.minimum(segments + 1, len(tracks.time_s) - 1)]
    fibers = view.fibers_shown()
    seen = (end >= view.from_s) & (begin <= view.to_s) & (fiber >= fibers.start) & (fiber < fibers.stop)
    return fiber[seen], begin[seen], end[seen], segments[seen]


def _lit(painter: QPainter, view: View, shown: Shown) -> None:
    """Everything that one number moves: a frame round each move."""
    if not len(shown.lit):
        return
    fiber, begin, end, _ = _visible_segments(view, shown.weave.tracks, shown.lit)
    left, right = _spans(view, begin, end, view.look.px(6))
    shift = view.plan.top - view.scroll
    top, bottom = view.rows.top[fiber] + shift, view.rows.bottom[fiber] + shift
    boxes = [
        QRectF(a, c, b - a, max(d - c, view.look.px(3)))
        for a, b, c, d in zip(left.tolist()[:MOST_MARKS], right.tolist(), top.tolist(), bottom.tolist(), strict=False)
    ]
    painter.setBrush(Qt.BrushStyle.NoBrush)
    for of, width in ((view.look.theme.ground, view.look.px(3)), (view.look.theme.chosen, view.look.px(1.5))):
        painter.setPen(pen(of, width))
        painter.drawRects(boxes)


def hits_shown(view: View, hits: Hits) -> NDArray[np.int64] | None:
    """The hits that are drawn, and may be grabbed; None where threads are too thin or hits too many."""
    fibers = view.fibers_shown()
    if not len(fibers) or view.rows.bottom[fibers.start] - view.rows.top[fibers.start] < view.look.px(HIT_FROM):
        return None
    return in_view(hits, fibers, view.from_s, view.to_s, MOST_HITS)


def _hits(painter: QPainter, view: View, shown: Shown) -> None:
    """A rhomb where each move lands, large where the keys are on it."""
    which = hits_shown(view, shown.hits)
    look = view.look
    if which is not None and len(which):
        mark = _rhomb(view, 3.5)
        half = mark.width() / 2
        for fiber, at in zip(shown.hits.fiber[which].tolist(), shown.hits.at_s[which].tolist(), strict=True):
            top, bottom = view.y_of(fiber)
            painter.drawImage(QPointF(round(view.x_of(at) - half), round((top + bottom) / 2 - half)), mark)
    if shown.hit >= 0:
        fiber, at = int(shown.hits.fiber[shown.hit]), float(shown.hits.at_s[shown.hit])
        top, bottom = view.y_of(fiber)
        rhomb(painter, QPointF(view.x_of(at), (top + bottom) / 2), look.px(7), look.theme.chosen, look.theme.ground, look.px(2))


def _rhomb(view: View, size: float) -> QImage:
    look = view.look
    side = 2 * look.px(size) + 3
    mark = QImage(side, side, QImage.Format.Format_ARGB32_Premultiplied)
    mark.fill(Qt.GlobalColor.transparent)
    inner = QPainter(mark)
    inner.setRenderHint(QPainter.RenderHint.Antialiasing)
    rhomb(inner, QPointF(side / 2, side / 2), look.px(size), look.theme.hit, look.theme.hit_edge, look.px(1.2))
    inner.end()
    return mark


def rhomb(
    painter: QPainter, at: QPointF, size: float, fill: tuple[int, int, int], edge: tuple[int, int, int], width: float
) -> None:
    """Draw a rhomb about a point."""
    painter.setPen(pen(edge, width))
    painter.setBrush(colour(fill))
    x, y = at.x(), at.y()
    corners = [QPointF(x, y - size), QPointF(x + size, y), QPointF(x, y + size), QPointF(x - size, y)]
    painter.drawPolygon(QPolygonF(corners))


def _moved_strip(painter: QPainter, view: View, shown: Shown) -> None:
    """A dotted strip above the cloth where hits would move: seen however thin threads are."""
    look = view.look
    assert shown.ghost is not None
    _, here, there = moved_hits(shown.weave.tracks, shown.ghost)
    first, last = np.minimum(here, there), np.maximum(here, there)
    seen = (last >= view.from_s) & (first <= view.to_s)
    top = view.plan.strip_top + look.px(8)
    painter.setPen(pen(look.theme.ghost, look.px(2), dash=(1.5, 1.5)))
    left, right = view.plan.left, view.plan.left + view.plan.width
    spans = _joined(*_spans(view, first[seen], last[seen], look.px(2)))
    painter.drawLines([QLineF(max(a, left), top, min(b, right), top) for a, b in spans])


def _moved(painter: QPainter, view: View, shown: Shown) -> None:
    """Arrows from where hits are to where they would be, where threads have room for them."""
    look = view.look
    assert shown.ghost is not None
    fiber, here, there = moved_hits(shown.weave.tracks, shown.ghost)
    fibers = view.fibers_shown()
    seen = (np.maximum(here, there) >= view.from_s) & (np.minimum(here, there) <= view.to_s)
    which = np.flatnonzero(seen & (fiber >= fibers.start) & (fiber < fibers.stop))
    tall = view.rows.bottom[fibers.start] - view.rows.top[fibers.start] if len(fibers) else 0
    if tall < max(SPLIT_FROM, look.px(SPLIT_FROM)) or len(which) > MOST_HITS:
        return
    for index in which.tolist():
        top, bottom = view.y_of(int(fiber[index]))
        y = top + (bottom - top) * 0.72
        _arrow(painter, view, view.x_of(float(here[index])), view.x_of(float(there[index])), y)


def _arrow(painter: QPainter, view: View, begin: float, end: float, y: float) -> None:
    look = view.look
    size = look.px(3)
    if abs(end - begin) < look.px(3):
        return
    back = -size * 1.6 if end > begin else size * 1.6
    for of, width in ((look.theme.ground, look.px(3.2)), (look.theme.ghost, look.px(1.4))):
        painter.setPen(pen(of, width))
        painter.setBrush(colour(of))
        painter.drawLine(QPointF(begin, y), QPointF(end + back, y))
        painter.drawPolygon(QPolygonF([QPointF(end, y), QPointF(end + back, y - size), QPointF(end + back, y + size)]))


def passage(painter: QPainter, view: View, from_s: float, to_s: float) -> None:
    """Draw the passage that is gone round in: a bracket over the threads, and a line at either end of it through them."""
    look, plan = view.look, view.plan
    if to_s <= view.from_s or from_s >= view.to_s:
        return
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    left, right = (min(max(view.x_of(at), plan.left), plan.left + plan.width) for at in (from_s, to_s))
    y, foot = plan.strip_top - look.px(2), plan.top + view.shown
    painter.setPen(pen(look.theme.head, look.px(3)))
    painter.drawLine(QPointF(left, y), QPointF(right, y))
    painter.setPen(pen(look.theme.head, look.px(1), dash=(2.0, 4.0)))
    for at, x in ((from_s, left), (to_s, right)):
        if view.from_s <= at <= view.to_s:
            painter.drawLine(QPointF(x, y), QPointF(x, foot))


def head(painter: QPainter, view: View, at_s: float) -> None:
    """Draw the play head: a line through everything, with a foot on the bars."""
    look, plan = view.look, view.plan
    if not view.from_s <= at_s <= view.to_s:
        return
    x, size = view.x_of(at_s), look.px(HEAD_PX)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    painter.setPen(pen(look.theme.ground, look.px(4), 160))
    painter.drawLine(QPointF(x, plan.strip_top), QPointF(x, view.lanes_top + view.lanes_height))
    painter.setPen(pen(look.theme.head, look.px(1.6)))
    painter.drawLine(QPointF(x, plan.strip_top), QPointF(x, view.lanes_top + view.lanes_height))
    painter.setBrush(colour(look.theme.head))
    top = plan.strip_top
    painter.drawPolygon(QPolygonF([QPointF(x - size, top - size), QPointF(x + size, top - size), QPointF(x, top + size)]))


def dragged(painter: QPainter, view: View, fiber: int, was_s: float, now_s: float, words: str, grid_s: Sequence[float]) -> None:
    """Draw a hit under the hand: the grid that it snaps to, where it was, where it is, and that in words."""
    look, plan = view.look, view.plan
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    painter.setPen(pen(look.theme.chosen, look.px(1), 90))
    painter.drawLines([QLineF(view.x_of(at), plan.top, view.x_of(at), plan.top + view.shown) for at in grid_s])
    x, (top, bottom) = view.x_of(now_s), view.y_of(fiber)
    painter.setPen(pen(look.theme.chosen, look.px(1.6)))
    painter.drawLine(QPointF(x, plan.strip_top), QPointF(x, plan.top + view.shown))
    middle = (top + bottom) / 2
    rhomb(painter, QPointF(view.x_of(was_s), middle), look.px(5), look.theme.ground, look.theme.chosen, look.px(1.5))
    rhomb(painter, QPointF(x, middle), look.px(7), look.theme.chosen, look.theme.ground, look.px(2))
    wide = look.width(words, 12, True) + look.px(12)
    left = min(max(x + look.px(10), plan.left), plan.left + plan.width - wide)
    high = look.px(20)
    place = max(top - high - look.px(6), plan.top) if top - high > plan.top else bottom + look.px(6)
    box = QRectF(left, place, wide, high)
    painter.fillRect(box, colour(look.theme.raised))
    look.write(painter, box.adjusted(look.px(6), 0, 0, 0), words, 12, look.theme.ink, LEFT, bold=True)
