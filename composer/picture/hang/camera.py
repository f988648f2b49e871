"""How the room is seen: front, side, three-quarter; the frame that holds it, and the bar that says how large it is."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.picture.hang.shapes import Hanging, centre_lines

Array = NDArray[np.float64]

LEAST_SPAN_M = 0.05

SAMPLES = 17
"""Strains at which the reach of the fibers is looked up: a full turn is then seen every 22 degrees."""


@dataclass(frozen=True, slots=True)
class View:
    """A way of seeing: its name, its word for people, its key, and from where: degrees round from the front, and up."""

    name: str
    word: str
    key: str
    round_deg: float
    up_deg: float


VIEWS: dict[str, View] = {
    view.name: view
    for view in (
        View("front", "Front", "F", 0.0, 0.0),
        View("side", "Side", "S", 90.0, 0.0),
        View("three-quarter", "Three-quarter", "T", 35.0, 18.0),
    )
}
"""All ways of seeing the room; x is to the right and z up in front of it, y away from whoever looks."""


def turned(points: ArrayLike, view: View) -> Array:
    """Points (N, 3) in m as seen, (N, 2): to the right and up, without perspective (orthographic)."""
    points = np.asarray(points, dtype=float)
    return points @ _axes(view).T


def depth(points: ArrayLike, view: View) -> Array:
    """How far behind the origin points (N, 3) lie for whoever looks, (N,) in m."""
    azimuth, up = np.radians(view.round_deg), np.radians(view.up_deg)
    return np.asarray(points, dtype=float) @ np.array(
        [-np.sin(azimuth) * np.cos(up), np.cos(azimuth) * np.cos(up), -np.sin(up)]
    )


def _axes(view: View) -> Array:
    """What is to the right and what is up, as unit vectors (2, 3)."""
    azimuth, up = np.radians(view.round_deg), np.radians(view.up_deg)
    right = [np.cos(azimuth), np.sin(azimuth), 0.0]
    upward = [-np.sin(up) * np.sin(azimuth), np.sin(up) * np.cos(azimuth), np.cos(up)]
    # Seen from above, what is farther back stands higher.
    return np.array([right, upward])


@dataclass(frozen=True, slots=True)
class Camera:
    """A view onto a picture: pixel = `left`, `top` + (right, -up) in m times `scale` pixels a metre."""

    view: View
    left: float
    top: float
    scale: float

    def pixels(self, points: ArrayLike) -> Array:
        """Pixels (N, 2) of points (N, 3) in m."""
        seen = turned(points, self.view)
        return np.column_stack([self.left + self.scale * seen[:, 0], self.top - self.scale * seen[:, 1]])

    def zoomed(self, factor: float, x: float, y: float) -> "Camera":
        """So many times as large, the pixel (x, y) staying where it is."""
        return replace(self, left=x + (self.left - x) * factor, top=y + (self.top - y) * factor, scale=self.scale * factor)

    def moved(self, dx: float, dy: float) -> "Camera":
        """Moved by pixels."""
        return replace(self, left=self.left + dx, top=self.top + dy)


def extent(hanging: Hanging, stroke: ArrayLike) -> Array:
    """The points (N, 3) that every motion stays among, nearly: all lines from rest to full stroke (F,)."""
    stroke = np.asarray(stroke, dtype=float)
    return np.concatenate([centre_lines(hanging, share * stroke) for share in np.linspace(0.0, 1.0, SAMPLES)])


def fitted(points: Array, view: View, left: float, top: float, width: float, height: float) -> Camera:
    """The camera that has all points (N, 3) within a box of pixels, in its middle."""
    if not len(points):
        return Camera(view, left + width / 2.0, top + height / 2.0, width)
    seen = turned(points, view)
    low, high = seen.min(axis=0), seen.max(axis=0)
    span = np.maximum(high - low, LEAST_SPAN_M)
    scale = float(min(width / span[0], height / span[1]))
    middle = (low + high) / 2.0
    return Camera(view, left + width / 2.0 - scale * middle[0], top + height / 2.0 + scale * middle[1], scale)


def scale_bar(scale: float, most_px: float) -> tuple[float, str]:
    """The length in m of a bar of at most `most_px` pixels that is 1, 2 or 5 of a unit, and its words."""
    most = most_px / scale
    power = 10.0 ** np.floor(np.log10(most))
    length = float(max(step * power for step in (1.0, 2.0, 5.0) if step * power <= most * (1.0 + 1e-12)))
    if length >= 1.0:
        return length, f"{length:g} m"
    return (length, f"{length * 100.0:g} cm") if length >= 0.01 else (length, f"{length * 1000.0:g} mm")
