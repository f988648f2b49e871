"""How a score falls into pages for a wall: whole bars along, whole bands of threads across."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.picture.bands import Band
from composer.picture.bars import Bars
from composer.score.model import Score
from composer.score.tempo import TempoMap

Array = NDArray[np.float64]

PAGE_S = 60.0
"""Seconds that a page shows at most, unless a single bar lasts longer."""
PAGE_THREADS = 96
"""Threads that a page shows at most."""
MOST_BARS = 4096
"""Bars that a page shows at most; they are looked at together, so that a score of many short bars is cut quickly."""


@dataclass(frozen=True, slots=True)
class Sheet:
    """A page of cloth: `from_bar` to before `to_bar`, from 0, their instants in s, and which bands it shows."""

    from_bar: int
    to_bar: int
    from_s: float
    to_s: float
    bands: tuple[Band, ...]


@dataclass(frozen=True, slots=True)
class Named:
    """A section's name and an instant at which it starts."""

    name: str
    at_s: float


def sheets(tempo: Bars, to_s: float, bands: Sequence[Band]) -> Iterator[Sheet]:
    """The pages of a score that ends at `to_s`, in reading order: along in time, and each stretch's threads from the top."""
    parts = list(parts_of(bands))
    for first, last, begins, ends in bar_runs(tempo, to_s):
        for part in parts:
            yield Sheet(first, last, begins, ends, part)


def bar_runs(tempo: Bars, to_s: float) -> Iterator[tuple[int, int, float, float]]:
    """Runs of whole bars of at most PAGE_S each, one bar at least: first, last (not in it), from and to in s."""
    count = max(1, int(np.ceil(float(tempo.bars(tempo.counts(to_s))) - 1e-6)))
    first = 0
    while first < count:
        ahead = np.arange(first, min(first + MOST_BARS, count) + 1)
        edges = tempo.seconds(tempo.counts_of_bars(ahead))
        fits = max(1, int(np.searchsorted(edges, edges[0] + PAGE_S * (1.0 + 1e-9), side="right")) - 1)
        yield first, first + fits, float(edges[0]), float(edges[fits])
        first += fits


def parts_of(bands: Sequence[Band]) -> Iterator[tuple[Band, ...]]:
    """Bands on end that have at most PAGE_THREADS threads together; a larger band is cut."""
    held: list[Band] = []
    room = PAGE_THREADS
    for band in bands:
        if held and band.last - band.first > room:
            yield tuple(held)
            held, room = [], PAGE_THREADS
        first = band.first
        while band.last - first > room:
            yield (Band(band.name, first, first + room),)
            first += room
        held.append(Band(band.name, first, band.last))
        room -= band.last - first
        if not room:
            yield tuple(held)
            held, room = [], PAGE_THREADS
    if held or not bands:
        yield tuple(held)


def sections_of(score: Score, tempo: TempoMap) -> tuple[Named, ...]:
    """Where the sections of a score start, every repeat of each, in order of time."""
    found = []
    for section in score.sections:
        start = tempo.counts_of(section.at)
        repeat = section.repeat
        times = 1 if repeat is None or repeat.every is None else repeat.times
        by = np.arange(times) * (0.0 if repeat is None or repeat.every is None else float(repeat.every.value))
        unit = "counts" if repeat is None or repeat.every is None else repeat.every.unit
        found += [Named(section.name, float(at)) for at in tempo.seconds(tempo.shifted(np.full(times, start), by, unit))]
    return tuple(sorted(found, key=lambda one: one.at_s))


def names_on(sections: Sequence[Named], from_s: float, to_s: float) -> list[str]:
    """The sections of a page: the one under way at its start, and those that start on it; each once."""
    before = [one.name for one in sections if one.at_s <= from_s + 1e-6][-1:]
    here = [one.name for one in sections if from_s + 1e-6 < one.at_s < to_s - 1e-6]
    return list(dict.fromkeys(before + here))
