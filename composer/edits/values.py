"""From an instant or a strain to the number that says it, on the grid or off it, in the form of the one that stands there."""

from fractions import Fraction

import numpy as np

from composer.limits.abilities import Abilities
from composer.score.numbers import Unreadable, written
from composer.score.spans import Handle
from composer.score.tempo import TempoMap

OFF_GRID = Fraction(1, 1000)
"""Counts, seconds or bars to which a number off the grid is rounded, where it is written as a decimal."""

OFF_GRID_FRACTION = Fraction(1, 96)
"""The same where it is written as a fraction: what divides it divides it into thirds, quarters, sixths and eighths."""

MICRO = Fraction(1, 1_000_000)
"""Seconds to which a place on the grid is written where the number is in seconds."""

TARGET_STEPS = {
    "stroke": Fraction(1, 100),
    "%": Fraction(1, 10),
    "mm": Fraction(1),
    "deg": Fraction(1),
    "hold": Fraction(1, 100),
}
"""Steps of targets by unit; off the grid a tenth of that."""

TARGET_FRACTION = Fraction(1, 24)
"""The step of a target that is written as a fraction; off the grid 1/96."""


def form_of(text: str) -> str:
    """ "whole", "decimal", "fraction", "mixed"; "word" for a target that is one."""
    try:
        return written(text).form
    except Unreadable:
        return "word"


def nearest(value: float, step: Fraction) -> Fraction:
    """The multiple of a step that is nearest to a value."""
    return round(Fraction(value) / step) * step


def off_grid(form: str) -> Fraction:
    """What a number of such a form is rounded to off the grid."""
    return OFF_GRID_FRACTION if form in ("fraction", "mixed") else OFF_GRID


def moved_by(handle: Handle, from_s: float, to_s: float, tempo: TempoMap) -> float:
    """How far it is between two instants, in a handle's unit: counts for a place."""
    if handle.unit == "s":
        return to_s - from_s
    counts = tempo.counts(np.array([from_s, to_s]))
    if handle.unit == "bars":
        counts = tempo.bars(counts)
    return float(counts[1] - counts[0])


def snapped(handle: Handle, text: str, value: float, lands_s: float, grid: Fraction, free: bool, tempo: TempoMap) -> Fraction:
    """A new value for a handle's number, on the grid of counts or off it; for a place, `value` is in counts from the start.

    lands_s: the instant that the value stands for; text: the number as written
    """
    if free:
        return nearest(value, off_grid(form_of(text.partition(":")[2] or text)))
    if handle.unit == "s":
        on = float(tempo.seconds(float(nearest(float(tempo.counts(lands_s)), grid))))
        return nearest(value + on - lands_s, MICRO)
    if handle.unit == "bars":
        counts = float(tempo.counts(lands_s))
        bar = np.floor(float(tempo.bars(counts)))
        return nearest(value, grid / max(1, round(float(tempo.counts_of_bars(bar + 1) - tempo.counts_of_bars(bar)))))
    return nearest(value, grid)


def place_of(counts: Fraction, tempo: TempoMap) -> tuple[int, Fraction]:
    """Bar and count, both from 1, of counts from the score's start."""
    bar = int(np.floor(float(tempo.bars(float(counts))) + 1e-12))
    return bar + 1, counts - round(float(tempo.counts_of_bars(bar))) + 1


def counts_from_place(handle: Handle, tempo: TempoMap) -> Fraction:
    """Counts from the score's start of a place as written."""
    return Fraction(round(float(tempo.counts_of_bars(handle.bar - 1)))) + handle.value - 1


def per_strain(unit: str, fiber: int, abilities: Abilities) -> float:
    """How much of a target's unit one of strain is, for a fiber."""
    if unit == "%":
        return 100.0
    if unit == "mm":
        return float(abilities.length_mm[fiber])
    if unit == "deg":
        return float(abilities.turn_deg[fiber])
    return 1.0 / float(abilities.stroke[fiber])


def target_on_steps(unit: str, text: str, value: float, free: bool) -> Fraction:
    """A target's new value, on the steps of its unit, or a tenth of them."""
    if form_of(text) in ("fraction", "mixed"):
        return nearest(value, OFF_GRID_FRACTION if free else TARGET_FRACTION)
    step = TARGET_STEPS[unit]
    return nearest(value, step / 10 if free else step)
