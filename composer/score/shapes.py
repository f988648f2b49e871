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
