"""A knot of a strand, or a hit of the cloth, dragged: one number of the text rewritten in the form it was written in."""

from dataclasses import dataclass
from fractions import Fraction

from composer.edits.edit import Edit, Refusal
from composer.edits.made import Made
from composer.score.model import Span

GRIDS = (Fraction(1), Fraction(1, 2), Fraction(1, 3), Fraction(1, 4), Fraction(1, 6), Fraction(1, 8), Fraction(1, 16))
"""Grids that a composer may choose, in counts."""


@dataclass(frozen=True, slots=True)
class Grip:
    """A knot that can be taken hold of: fiber, knot (index into the tracks), instant and strain as they are.

    time, target: the spans of the numbers that give it its time and its target; None where it has none of its own
    why_not_time, why_not_target: a sentence where it has none
    players: lines of the entries that move with it
    """

    fiber: int
    knot: int
    at_s: float
    strain: float
    time: Span | None
    target: Span | None
    why_not_time: str
    why_not_target: str
    players: tuple[int, ...]


def grip(made: Made, fiber: int, knot: int) -> Grip:
    """What a knot hangs from: what can be dragged, and what moves with it. `knot` is an index into `made.tracks`."""
    raise NotImplementedError


def knot_near(made: Made, fiber: int, seconds: float) -> int:
    """The knot (index into the tracks) of a fiber that is nearest to an instant."""
    raise NotImplementedError


def drag(
    text: str,
    made: Made,
    held: Grip,
    time_s: float | None = None,
    strain: float | None = None,
    grid: Fraction = Fraction(1, 4),
    free: bool = False,
) -> Edit | Refusal:
    """A knot dragged to an instant, to a strain, or both (then two numbers): each number rewritten in its own form.

    grid: counts to whose multiples times snap, unless `free`. `made` is what follows from `text` as it stands.
    """
    raise NotImplementedError


def drag_hit(
    text: str, made: Made, was_s: float, time_s: float, fiber: int, grid: Fraction = Fraction(1, 4), free: bool = False
) -> Edit | Refusal:
    """A hit of the cloth dragged from one instant to another, by the fiber under the pointer."""
    raise NotImplementedError


def copy_for_this_one(text: str, made: Made, entry: int) -> Edit | Refusal:
    """The phrase of the entry in line `entry` copied under a new name, behind the original, and the entry playing the copy."""
    raise NotImplementedError
