"""The shapes of a move: progress over the share of its time gone, as polynomials; a new shape is one row."""

import numpy as np

NAMES = ("smooth", "linear", "swell", "settle", "sudden", "step", "curve")

PROGRESS = {
    "smooth": np.array([0.0, 0.0, 0.0, 10.0, -15.0, 6.0]),  # minimum jerk, Flash and Hogan 1985
    "linear": np.array([0.0, 1.0, 0.0, 0.0, 0.0, 0.0]),
    "swell": np.array([0.0, 0.0, 1.0, 0.0, 0.0, 0.0]),
    "settle": np.array([0.0, 2.0, -1.0, 0.0, 0.0, 0.0]),
    "sudden": np.array([0.0, 1.0, 0.0, 0.0, 0.0, 0.0]),  # as an array only: in time it follows the rate table
    "step": np.array([0.0, 1.0, 0.0, 0.0, 0.0, 0.0]),
}
"""Coefficients of p(u), lowest power first. `curve` has none: its line gives the control values of a Bézier curve."""

BACKWARDS = {"swell": "settle", "settle": "swell"}
"""What each shape becomes in a phrase played backwards, where that is another."""

QUIET = "smooth"
"""The shape of a line that names none."""

SAYS: dict[str, tuple[str, str]] = {
    "smooth": ("10u³ − 15u⁴ + 6u⁵", "limb-like: leaves and arrives softly (the minimum-jerk profile)"),
    "linear": ("u", "constant speed"),
    "swell": ("u²", "gathers speed"),
    "settle": ("1 − (1 − u)²", "leaves fast, arrives softly"),
    "sudden": ("as fast as the fiber can go", "an accent: starts late, arrives exactly on the count"),
    "step": ("a jump on the count", "tests and on/off gear; the checker reports it"),
    "curve": ("a Bézier curve of degree 5", "any other way there, by its control values"),
}
"""Each shape's progress and its use, as the manual tells them; u runs from 0 to 1 over the move."""
