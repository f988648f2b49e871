"""The retiming taken into the text: numbers rewritten such that the text expands to the retimed times."""

from dataclasses import dataclass

from composer.edits.edit import Edit, Refusal
from composer.edits.made import Made, Remake
from composer.retime.retiming import Retiming


@dataclass(frozen=True, slots=True, eq=False)
class Taken:
    """The edit that takes a retiming in, and what comes of it.

    after: what follows from the edited text; off_s: the most by which one of its knots misses its retimed instant, in s
    notes: sentences on what could not be said by rewriting numbers, and what was written instead
    """

    edit: Edit
    after: Made
    off_s: float
    notes: tuple[str, ...]


def take(
    text: str, made: Made, retiming: Retiming, remake: Remake, from_s: float = 0.0, to_s: float = float("inf")
) -> Taken | Refusal:
    """The retiming of `made.tracks` taken into the text, where instants as written lie from `from_s` to `to_s`: all, a
    passage, or one hit (both its instant). Takes a while: for a worker."""
    raise NotImplementedError
