"""Where fibers hang, and the line of each in space as it moves: one curve of constant curvature and torsion for every kind.

A straight fiber has neither curvature nor torsion, a bending one has curvature, a coiling one both; so one formula draws all.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.fiber.bending import Bending
from composer.fiber.coiling import Coiling
from composer.fiber.contractile import Contractile
from composer.rig.model import Fiber, Rig

Array = NDArray[np.float64]
Index = NDArray[np.int64]

STRAIGHT_POINTS, BENT_POINTS = 2, 25
POINTS_A_TURN, MOST_POINTS = 14, 193
RATED_RADIUS_M = 2.0e-3
"""A maker's sheet gives no diameter; this one is drawn."""

SMALL = 1e-3


@dataclass(frozen=True, slots=True, eq=False)
class Hanging:
    """F fibers where they hang, lengths in m, as arrays by fiber; the points of all lines lie end to end.

    at: (F, 3) where each hangs; along, side, across: (F, 3) a right-handed frame: the way it runs, the way it bends, the third
    length, held: (F,) at rest, all of a series, and how much of that a thread holds, from where it hangs; 0 where none does
    grows: (F,) 1 where strain lengthens, -1 where it shortens
    bend: (F,) curvature in 1/m for a strain of 1, before the centre line's own strain; wind: (F,) angle b of the thread
    coils: (F,) whether it coils, so that curvature is per metre as it is now
    radius, thick: (F,) at rest in m; what makes it fatter: cos² of the braid's angle (nan: volume kept; inf: radius held)
    shrinks: (F,) the k of lambda1 = 1 - k e
    first: (F + 1,) where the points of each fiber begin; of, share: (N,) the fiber of each point, 0 to 1 along it
    """

    at: Array
    along: Array
    side: Array
    across: Array
    length: Array
    held: Array
    grows: Array
    bend: Array
    wind: Array
    coils: NDArray[np.bool_]
    radius: Array
    thick: Array
    shrinks: Array
    first: Index
    of: Index
    share: Array


def hanging_of(rig: Rig) -> Hanging:
    """The fibers of a rig where they hang.

    The rig file does not say which way a fiber bends: one that hangs down bends away from its partner in the mirror, to the
    right where it has none; any other bends upward.
    """
    rows = [_row(fiber) for fiber in rig.fibers]
    column = {name: np.array([row[name] for row in rows], dtype=float) for name in rows[0]} if rows else _no_rows()
    along = np.array([fiber.toward for fiber in rig.fibers], dtype=float).reshape(-1, 3)
    side = np.array([_side(fiber, rig) for fiber in rig.fibers], dtype=float).reshape(-1, 3)
    points = column.pop("points").astype(np.int64)
    first = np.concatenate([[0], np.cumsum(points)]).astype(np.int64)
    of = np.repeat(np.arange(len(points)), points)
    share = (np.arange(first[-1]) - first[of]) / np.maximum(points[of] - 1, 1)
    return Hanging(
        at=np.array([fiber.at_m for fiber in rig.fibers], dtype=float).reshape(-1, 3),
        along=along,
        side=side,
        across=np.cross(along, side),
        coils=column.pop("coils").astype(bool),
        first=first,
        of=of,
        share=share,
        **column,
    )


def _row(fiber: Fiber) -> dict[str, float]:
    """The numbers of one fiber."""
    make = fiber.type.make
    series = fiber.mounting.series
    base: Any = make.base if isinstance(make, Bending | Coiling) else make
    rated = fiber.type.kind == "rated"
    row = {
        "length": base.rest_length_mm * 1e-3 * series,
        "held": 0.0,
        "grows": 1.0 if base.direction == "extend" else -1.0,
        "bend": 0.0,
        "wind": 0.0,
        "coils": 0.0,
        "radius": RATED_RADIUS_M if rated else base.radius_mm * 1e-3,
        "thick": np.inf if base.direction == "extend" else np.nan,
        "shrinks": 1.0,
        "points": STRAIGHT_POINTS,
    }
    if isinstance(base, Contractile):
        row["thick"] = np.cos(np.radians(base.braid_angle_deg)) ** 2
        row["shrinks"] = base.end_factor
    if base is not make:
        row["held"] = make.constraint_length_mm * 1e-3 * series
        row["bend"] = 1.0 / (base.radius_mm * 1e-3)
        row["points"] = BENT_POINTS
    if isinstance(make, Coiling):
        row["coils"] = 1.0
        row["wind"] = np.arctan2(2.0 * np.pi * base.radius_mm, make.constraint_pitch_mm)
        turns = row["bend"] * make.stop() * np.cos(row["wind"]) * row["held"] * (1.0 + make.stop()) / (2.0 * np.pi)
        row["points"] = int(np.clip(POINTS_A_TURN * turns, BENT_POINTS, MOST_POINTS))
    return row


def _no_rows() -> dict[str, Array]:
    names = ("length", "held", "grows", "bend", "wind", "coils", "radius", "thick", "shrinks", "points")
    return {name: np.zeros(0) for name in names}


def _side(fiber: Fiber, rig: Rig) -> Array:
    """The unit vector across a fiber to which it bends."""
    along = np.array(fiber.toward)
    if abs(along[2]) > 0.9:
        outward = 1.0
        if fiber.mirror is not None and rig.fibers[fiber.mirror].at_m[0] > fiber.at_m[0]:
            outward = -1.0
        side = np.array([outward, 0.0, 0.0])
    else:
        side = np.array([0.0, 0.0, 1.0])
    side = side - (side @ along) * along
    return side / np.linalg.norm(side)


def lengths(hanging: Hanging, strain: ArrayLike) -> Array:
    """Length in m of each fiber's centre line at `strain` (F,)."""
    return hanging.length * (1.0 + hanging.grows * np.asarray(strain, dtype=float))


def radii(hanging: Hanging, strain: ArrayLike) -> Array:
    """Outer radius in m of each fiber at `strain` (F,).

    A braid's follows its angle, r = r0 sin a / sin a0 with cos a = (1 - k e) cos a0 (Chou and Hannaford 1996); a sleeve holds
    it; a rated fiber, whose make is not known, is drawn as if it kept its volume.
    """
    strain = np.asarray(strain, dtype=float)
    square = hanging.thick * (1.0 - hanging.shrinks * strain) ** 2
    with np.errstate(invalid="ignore", divide="ignore"):
        braided = np.sqrt(np.maximum(1.0 - square, 0.0) / (1.0 - hanging.thick))
        kept = 1.0 / np.sqrt(np.maximum(1.0 + hanging.grows * strain, SMALL))
    fatter = np.where(np.isinf(hanging.thick), 1.0, np.where(np.isnan(hanging.thick), kept, braided))
    return hanging.radius * fatter


def bends(hanging: Hanging, strain: ArrayLike) -> tuple[Array, Array]:
    """Curvature and torsion (F,) in 1/m of the held part of each centre line at `strain` (F,).

    The thread at distance r keeps its length, so an arc turns by theta = Lc e / r over a centre line of Lc (1 ± e); a helix has
    k = (theta / Lc) cos² b and t = (theta / Lc) sin b cos b.
    """
    strain = np.asarray(strain, dtype=float)
    turn = hanging.bend * strain
    arc = turn / np.maximum(1.0 + hanging.grows * strain, SMALL)
    cos, sin = np.cos(hanging.wind), np.sin(hanging.wind)
    return np.where(hanging.coils, turn * cos**2, arc), np.where(hanging.coils, turn * sin * cos, 0.0)


def centre_lines(hanging: Hanging, strain: ArrayLike) -> Array:
    """The points (N, 3) in m of all centre lines at `strain` (F,), those of fiber f from `first[f]` to before `first[f + 1]`.

    The held part is a curve of constant curvature and torsion that sets out along the fiber's way (Frenet and Serret; do Carmo
    1976, section 1-5); what no thread holds runs on straight from its end. A coil turns about its upper end while its first
    turn forms, until its axis lies along the fiber's way, as a coil hangs.
    """
    strain = np.asarray(strain, dtype=float)
    stretch = np.maximum(1.0 + hanging.grows * strain, SMALL)
    curvature, torsion = bends(hanging, strain)
    along, side, across = _frames(hanging, curvature, torsion, hanging.held * stretch)
    of = hanging.of
    gone = hanging.share * (hanging.length * stretch)[of]
    on_held = np.minimum(gone, (hanging.held * stretch)[of])
    beyond = gone - on_held
    k, t = curvature[of], torsion[of]
    ks, ts = k * on_held, t * on_held
    sinc, cosc, third = _turning(np.hypot(ks, ts))
    x = on_held * (1.0 - ks * ks * third) + beyond * (1.0 - ks * ks * cosc)
    y = on_held * ks * cosc + beyond * ks * sinc
    z = on_held * ks * ts * third + beyond * ks * ts * cosc
    return hanging.at[of] + x[:, None] * along[of] + y[:, None] * side[of] + z[:, None] * across[of]


def _turning(angle: Array) -> tuple[Array, Array, Array]:
    """sin x / x, (1 - cos x) / x² and (x - sin x) / x³, and their limits at 0."""
    near = angle < 0.05
    x = np.where(near, 1.0, angle)
    square = angle * angle
    sin, cos = np.sin(x), np.cos(x)
    return (
        np.where(near, 1.0 - square / 6.0 + square**2 / 120.0, sin / x),
        np.where(near, 0.5 - square / 24.0 + square**2 / 720.0, (1.0 - cos) / (x * x)),
        np.where(near, 1.0 / 6.0 - square / 120.0 + square**2 / 5040.0, (x - sin) / (x * x * x)),
    )


def _frames(hanging: Hanging, curvature: Array, torsion: Array, held: Array) -> tuple[Array, Array, Array]:
    """The frames (F, 3) each in which lines set out: those of the fibers, but coils are turned to hang."""
    if not hanging.coils.any():
        return hanging.along, hanging.side, hanging.across
    turning = np.hypot(curvature, torsion)
    share = np.clip(turning * held / (2.0 * np.pi), 0.0, 1.0) * hanging.coils
    share = share * share * (3.0 - 2.0 * share)
    # The axis lies in the plane of the first tangent and the binormal, 90° - b from the tangent: a turn about the normal.
    angle = share * (np.pi / 2.0 - hanging.wind)
    cos, sin = np.cos(angle)[:, None], np.sin(angle)[:, None]
    along = cos * hanging.along - sin * hanging.across
    across = sin * hanging.along + cos * hanging.across
    return along, hanging.side, across
