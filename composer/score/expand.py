"""From a score to tracks: every entry, fiber and repeat as arrays, no object a move."""

import numpy as np

from composer.faults import Fault, Faults
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.expand_lines import Lines, phrase_lines
from composer.score.expand_starts import starts_of
from composer.score.expand_times import Moments, moments
from composer.score.layers import Timed, knots_of
from composer.score.model import Score
from composer.score.names import check_names
from composer.score.sums import MOST_PIECES, Crowded, summed
from composer.score.tempo import TempoMap, fault_at, tempo_map, with_text
from composer.tracks import Tracks


def expand(score: Score, rig: Rig, abilities: Abilities, selector: Selector, tempo: TempoMap | None = None) -> Tracks:
    """The tracks of a score on a rig; `tempo` is the score's tempo map where it has been made already.

    Raises Faults, all that are found: what `check_names` finds, then entries that take over at one instant, starts before
    the score's, and times that do not rise once every unit is seconds.
    """
    tempo = tempo or tempo_map(score)
    faults: list[Fault] = []

    def stop_at_faults() -> None:
        if faults:
            raise Faults(with_text(faults, score))

    faults += check_names(score, rig, selector)
    stop_at_faults()
    starts = starts_of(score, rig, selector, tempo, faults)
    lines = phrase_lines(score, starts.variants, faults)
    stop_at_faults()
    found = moments(starts, lines, tempo, rig, faults)
    stop_at_faults()
    owner = np.concatenate([np.arange(len(rig.fibers)), starts.fiber[starts.added]])
    duration = _duration(found)
    knots, timed = knots_of(found, starts, lines, abilities, len(owner))
    _check_swings(timed, lines, faults)
    stop_at_faults()
    entries = starts.entries
    del found, starts  # a large score needs the room
    try:
        return summed(knots, timed, owner, len(rig.fibers), duration, abilities)
    except Crowded as stop:
        crowded = next(entry for entry in entries if entry.span.line == stop.line)
        faults.append(
            fault_at(
                crowded.span,
                f"added moves overlap so often that they fall into more than {MOST_PIECES} pieces",
                "fewer at a time",
                "add fewer repeats, or repeats that are over before many more have begun",
            )
        )
        raise Faults(with_text(faults, score)) from None


MOST_SWINGS = 1_000_000
"""Periods of all quivers of a score together."""


def _check_swings(timed: Timed, lines: Lines, faults: list[Fault]) -> None:
    """So many periods at most that a check can look at each; the line is named that has the most of them."""
    if not len(timed.hertz):
        return
    swings = timed.hertz * (timed.until_s - timed.from_s)
    if (total := float(swings.sum())) > MOST_SWINGS:
        quiver = lines.written[int(np.bincount(timed.row, weights=swings).argmax())].quiver
        if quiver is not None:
            says = f"the quivers of this score swing {total:.0f} times in all, most of them here"
            faults.append(fault_at(quiver.span, says, f"at most {MOST_SWINGS} swings", "quiver for less long, or more slowly"))


def _duration(found: Moments) -> float:
    """When the last instance is over, by its phrase's length, its last line or the entry that takes over from it."""
    if not len(found.start):
        return 0.0
    over = np.maximum(found.end, np.maximum.reduceat(found.until, found.opens.nonzero()[0]))
    return float(np.minimum(over, found.cut).max())
