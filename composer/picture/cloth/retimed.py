"""A retiming as a picture: the score as written over the score retimed, arrows where hits moved, the air below."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QPainter, QPolygonF

from composer.limits.air import FREE_AIR_KPA, demand, refill_L_s
from composer.limits.buckets import level
from composer.limits.check import Check
from composer.picture.bands import bands_of
from composer.picture.bars import Bars, RetimedBars
from composer.picture.cloth import lanes, legend
from composer.picture.cloth import still as cloth
from composer.picture.cloth.still import Layout, layout, x_of
from composer.picture.image import column_times, extends, rows_of, shares
from composer.picture.look import LEFT, Look, colour, pen
from composer.picture.material import Piece
from composer.picture.scene import Lane, Scene, Stretch
from composer.score.tempo import TempoMap
from composer.tracks import Tracks

Array = NDArray[np.float64]

BETWEEN = 64
"""Pixels, at scale 1, between the two cloths, for the arrows and for what each cloth is."""


@dataclass(frozen=True, slots=True, eq=False)
class Both:
    """The score as written and as retimed, on one time axis, and the hits that moved: (M,) instants as written and retimed."""

    was: Scene
    now: Scene
    was_s: Array
    now_s: Array


def both_of(piece: Piece, checked: Check, now: Tracks, moved: Sequence[tuple[float, float]], warp: tuple[Array, Array],
            columns: int) -> Both:  # fmt: skip
    """The picture's content: a piece as written with what its check found, and its retimed tracks with their warp."""
    to_s = max(piece.tracks.duration_s, now.duration_s, 1e-3)
    tempo = piece.tempo
    bars: Bars = RetimedBars(tempo, *warp) if isinstance(tempo, TempoMap) else tempo
    snags = tuple(Stretch(snag.fiber, snag.from_s, snag.to_s) for snag in checked.snags)
    times = column_times(0.0, to_s, columns)
    scenes = [
        Scene(
            title=piece.title,
            subtitle=f"{len(moved)} {'hit' if len(moved) == 1 else 'hits'} moved",
            from_s=0.0,
            to_s=to_s,
            share=shares(tracks, piece.abilities, times),
            extending=extends(piece.abilities),
            bands=bands_of(piece.rig),
            names=piece.names,
            tempo=of,
            snags=found,
            pins_s=piece.pins_s,
        )
        for tracks, of, found in ((piece.tracks, tempo, snags), (now, bars, ()))
    ]
    air = (_air(piece, piece.tracks, times, "as written"), _air(piece, now, times, "retimed"))
    was_s, now_s = (np.array([pair[n] for pair in moved]) for n in (0, 1))
    return Both(scenes[0], replace(scenes[1], lanes=air), was_s, now_s)


def _air(piece: Piece, tracks: Tracks, times_s: Array, name: str) -> Lane:
    """The receiver's pressure by column, as the check reckons it: what fibers draw and the compressor gives, at once."""
    supply = piece.rig.supply
    asked = demand(tracks, piece.abilities)
    every = np.union1d(asked.time_s, times_s)
    here = level(every, np.interp(every, asked.time_s, asked.litres), refill_L_s(supply))
    missing = here.missing[np.searchsorted(every, times_s)]
    pressure = np.maximum(supply.max_receiver_kPa - missing * FREE_AIR_KPA / supply.receiver_L, 0.0)
    least, most = supply.min_pressure_kPa, supply.max_receiver_kPa
    low = min(float(pressure.min(initial=most)), least)
    return Lane(
        name, "receiver, kPa", pressure, max(0.0, low - 0.1 * (most - low)), most + 0.06 * (most - low) + 1.0, "supply",
        least, "minimum",
    )  # fmt: skip


def paint(painter: QPainter, both: Both, width: int, height: int) -> None:
    """Draw the whole picture."""
    plan = layout(width, height, len(both.now.lanes))
    look = plan.look
    gap = look.px(BETWEEN)
    rows = rows_of(both.was.bands, max((plan.room - gap) // 2, 1))
    below = replace(plan, top=plan.top + rows.height + gap, strip_top=plan.top + rows.height + gap - look.px(10))
    painter.fillRect(0, 0, width, height, colour(look.theme.ground))
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    cloth.heading(painter, plan, rows, both.was, width)
    cloth.threads(painter, plan, rows, both.was)
    cloth.threads(painter, below, rows, both.now)
    for at_s in both.was.pins_s:
        if both.was.from_s <= at_s <= both.was.to_s:
            head, foot = plan.cues_top + look.px(24), plan.bars_top + look.px(3)
            cloth.pin_at(painter, look, x_of(plan, both.was, at_s), head, foot)
    _what(painter, look, plan, plan.top - look.px(34), "as written")
    _what(painter, look, plan, plan.top + rows.height + gap / 2 - look.px(9), "retimed")
    _arrows(painter, plan, both, plan.top + rows.height + look.px(6), below.top - look.px(6))
    foot = below.top + rows.height
    free = height - foot - look.px(40) - look.px(28)
    lanes.paint(painter, look, both.now, plan.left, foot, plan.width, min(free, 2 * plan.lane_room))
    legend.paint(painter, look, both.was, QRectF(plan.left, height - look.px(36), plan.width, look.px(30)))


def _what(painter: QPainter, look: Look, plan: Layout, top: float, text: str) -> None:
    look.write(
        painter, QRectF(look.px(10), top, plan.left - look.px(20), look.px(18)), text, 12.5, look.theme.ink, LEFT, bold=True
    )


def _arrows(painter: QPainter, plan: Layout, both: Both, top: float, foot: float) -> None:
    """One arrow a pixel column at most: from where hits were written to where they have gone."""
    look, drawn = plan.look, set()
    size = look.px(4)
    for was_s, now_s in zip(both.was_s.tolist(), both.now_s.tolist(), strict=True):
        begin, end = x_of(plan, both.was, was_s), x_of(plan, both.now, now_s)
        if (round(begin), round(end)) in drawn:
            continue
        drawn.add((round(begin), round(end)))
        painter.setPen(pen(look.theme.cue, max(1.0, 1.3 * look.scale)))
        painter.drawLine(QPointF(begin, top), QPointF(end, foot - size))
        painter.setBrush(colour(look.theme.cue))
        painter.drawPolygon(
            QPolygonF([QPointF(end, foot), QPointF(end - size, foot - 2 * size), QPointF(end + size, foot - 2 * size)])
        )
