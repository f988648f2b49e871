"""The grids that what is dragged snaps to."""

from fractions import Fraction

GRIDS = (Fraction(1), Fraction(1, 2), Fraction(1, 3), Fraction(1, 4), Fraction(1, 6), Fraction(1, 8), Fraction(1, 16))
"""Grids that a composer may choose, in counts."""
