"""A rig's makes as an engineer sees them: stroke over pressure both ways, and the fastest rates over strain, a row for each."""

from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter

from composer.fiber import rates
from composer.fiber.capability import Capability
from composer.fiber.rates import Physics
from composer.limits.abilities import Abilities
from composer.picture.look import Look, colour
from composer.picture.plots import plot
from composer.picture.plots.plot import Axis, Curve
from composer.rig.model import Rig

WIDTH = 1600
SCALE = 1.25
HEAD, ROW, FOOT = 84, 360, 44
MOST_ROWS = 12
"""Makes in one picture; a rig that has more shows the first, and says so."""


@dataclass(frozen=True, slots=True, eq=False)
class Row:
    """One make as mounted: `title` names it and `fibers` who are of it, `able` what it can do."""

    title: str
    fibers: str
    able: Capability


@dataclass(frozen=True, slots=True, eq=False)
class Sheet:
    """The picture of a rig's makes, sizes in pixels; `left_out` makes have no room."""

    title: str
    subtitle: str
    rows: tuple[Row, ...]
    left_out: int
    width: int
    height: int


def sheet_of(rig: Rig, abilities: Abilities) -> Sheet:
    """The picture of a rig: a row for each make as mounted, in the order of the rig."""
    makes = list(dict.fromkeys(abilities.which.tolist()))
    rows = tuple(row_of(rig, abilities, which) for which in makes[:MOST_ROWS])
    left_out = len(makes) - len(rows)
    supply = rig.supply
    least = min(supply.pressure_kPa, supply.min_pressure_kPa)
    subtitle = f"{supply.medium} at {supply.pressure_kPa:g} kPa; strokes and rates at {least:g} kPa, the least that is promised"
    return Sheet(rig.name, subtitle, rows, left_out, WIDTH, HEAD + ROW * len(rows) + FOOT)


def row_of(rig: Rig, abilities: Abilities, which: int) -> Row:
    """One make of a rig as mounted, by the number of its capability."""
    members = np.flatnonzero(abilities.which == which)
    fiber = rig.fibers[members[0]]
    mounting = fiber.mounting
    parts = [fiber.type.name, fiber.type.kind]
    if fiber.type.kind != "rated":
        parts += [
            f"valve {mounting.valve.name}, C {mounting.valve.C_dm3_s_bar:g}",
            f"tube {mounting.tube_length_mm:g} x {mounting.tube_bore_mm:g} mm",
            f"load {mounting.load_N:g} N",
        ]
        parts += [f"bundle of {mounting.bundle}"] if mounting.bundle > 1 else []
        parts += [f"{mounting.series} in series"] if mounting.series > 1 else []
    names = [rig.fibers[member].name for member in members]
    who = names[0] if len(names) == 1 else f"{len(names)} fibers, {names[0]} to {names[-1]}"
    return Row(", ".join(parts), who, abilities.capabilities[which])


def paint(painter: QPainter, sheet: Sheet) -> None:
    """Draw the whole picture."""
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    look = Look(SCALE)
    painter.fillRect(QRectF(0, 0, sheet.width, sheet.height), colour(look.theme.ground))
    used = look.write(painter, QRectF(24, 18, sheet.width - 48, 36), sheet.title, 21, bold=True)
    look.write(painter, QRectF(44 + used, 22, sheet.width - used - 68, 34), sheet.subtitle, 13, look.theme.quiet_ink)
    for number, row in enumerate(sheet.rows):
        top = HEAD + number * ROW
        used = look.write(painter, QRectF(24, top, sheet.width * 0.7, 28), row.title, 14, bold=True)
        look.write(painter, QRectF(44 + used, top, sheet.width - used - 68, 28), row.fibers, 13, look.theme.quiet_ink)
        paint_able(painter, look, QRectF(16, top + 38, sheet.width - 32, ROW - 64), row.able)
    foot = QRectF(24, sheet.height - FOOT, sheet.width - 48, 30)
    look.write(painter, foot, foot_note(sheet), 12, look.theme.quiet_ink)


def paint_able(painter: QPainter, look: Look, box: QRectF, able: Capability) -> None:
    """Draw what one make can do: stroke over pressure on the left, fastest rates over strain on the right."""
    half = (box.width() - look.px(13)) / 2.0
    _stroke(painter, look, QRectF(box.left(), box.top(), half, box.height()), able)
    _rates(painter, look, QRectF(box.right() - half, box.top(), half, box.height()), able)


def foot_note(sheet: Sheet) -> str:
    """What stands below: of dashed lines only where some are drawn, which no rated make has."""
    notes = []
    if any(row.able.physics is not None for row in sheet.rows):
        notes.append(
            "Dashed: the last 2 % of stroke on either way keep the rate from before, as the pressure behind the flow dies away."
        )
    if sheet.left_out:
        notes.append(f"{sheet.left_out} more makes have no room here.")
    return "  ".join(notes)


def _unit(able: Capability) -> tuple[float, str]:
    """What a strain of 1 is on the bench, and its unit."""
    return (able.length_mm, "mm") if able.turn_deg is None else (able.turn_deg, "°")


def _stroke(painter: QPainter, look: Look, box: QRectF, able: Capability) -> None:
    if able.physics is None:
        box = box.adjusted(look.px(52), look.px(22), -look.px(12), -look.px(36))
        painter.fillRect(box, colour(look.theme.panel))
        note = "rated: a maker's sheet says nothing of pressure"
        look.write(painter, box.adjusted(look.px(16), 0, 0, 0), note, 13, look.theme.quiet_ink)
        return
    per_strain, unit = _unit(able)
    pressure, way_in, way_out = loop(able.physics)
    top = 1.06 * able.stroke * per_strain
    up = int(np.argmax(way_in >= 0.6 * able.stroke))
    down = int(np.argmax(way_out[::-1] <= 0.5 * able.stroke))
    curves = [
        Curve(pressure / 1e3, way_in * per_strain, look.theme.duty, "filling", arrows=(up,)),
        Curve(pressure[::-1] / 1e3, way_out[::-1] * per_strain, look.theme.supply, "exhausting", arrows=(down,)),
    ]
    x, y = Axis(0.0, pressure[-1] / 1e3, "pressure in kPa, gauge"), Axis(0.0, top, f"stroke in {unit}")
    plot.paint(painter, look, box, x, y, curves)


def loop(physics: Physics, points: int = 601) -> tuple[plot.Array, plot.Array, plot.Array]:
    """Pressures (N,) from none to full, Pa, and the strains on the way in up to there and on the way back."""
    strain = np.linspace(0.0, physics.stop * (1.0 - 1e-9), 8 * points)
    holds_in, holds_out = rates.pressures(physics, strain)
    pressure = np.linspace(0.0, physics.full, points)
    way_in = np.minimum(np.interp(pressure, holds_in, strain), physics.stroke)
    # On the way back the fiber stands still until the pressure has crossed the friction band.
    return pressure, way_in, np.minimum(np.interp(pressure, holds_out, strain), way_in[-1])


def _rates(painter: QPainter, look: Look, box: QRectF, able: Capability) -> None:
    per_strain, unit = _unit(able)
    at = able.strain * 100.0
    top = 1.1 * max(able.fill.max(), able.exhaust.max())
    curves = []
    for rate, of, name, held in (
        (able.fill, look.theme.duty, "fill", able.strain >= able.held_above),
        (able.exhaust, look.theme.supply, "exhaust", able.strain <= able.held_below),
    ):
        free = ~held if able.physics is not None else np.ones(len(at), dtype=bool)
        curves.append(Curve(at[free], rate[free], of, name))
        if able.physics is not None:
            # The dashed part begins where the other ends.
            edge = np.flatnonzero(held)
            edge = np.clip(np.arange(edge[0] - 1, edge[-1] + 2), 0, len(at) - 1)
            curves.append(Curve(at[edge], rate[edge], of, dashed=True))
    x = Axis(0.0, able.strain[-1] * 100.0, "strain in % of rest length")
    plot.paint(painter, look, box, x, Axis(0.0, top, "fastest rate in 1/s"), curves, Axis(0.0, top * per_strain, f"{unit}/s"))
