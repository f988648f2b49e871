"""From a thread of the cloth to the line that moves it, and from a line to the fibers that it moves, and when."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.score.model import Score, Span
from composer.tracks import Tracks


@dataclass(frozen=True, slots=True, eq=False)
class Threads:
    """Tracks made ready for asking, by fiber and by line; built once a state, each question by bisection."""

    score: Score
    tracks: Tracks
    fiber: NDArray[np.int64]
    by_line: NDArray[np.int64]
    lines: NDArray[np.int32]
    by_phrase_line: NDArray[np.int64]
    phrase_lines: NDArray[np.int32]


@dataclass(frozen=True, slots=True)
class Source:
    """What moves a fiber at an instant: the segment (index into the tracks), its times, and the lines that made it.

    line: of the section's entry; phrase_line: of the phrase's line, 0 where it stands in another file
    entry, move: their spans; `move` None where the line stands in another file
    """

    fiber: int
    segment: int
    from_s: float
    to_s: float
    line: int
    phrase_line: int
    entry: Span
    move: Span | None


@dataclass(frozen=True, slots=True, eq=False)
class Stretches:
    """Stretches of time of fibers, (n,) each, by fiber and time; those on end of one fiber are one."""

    fiber: NDArray[np.int64]
    from_s: NDArray[np.float64]
    to_s: NDArray[np.float64]


def threads_of(score: Score, tracks: Tracks) -> Threads:
    """Tracks made ready for asking."""
    raise NotImplementedError


def source_at(threads: Threads, fiber: int, seconds: float) -> Source | None:
    """What moves a fiber at an instant, or moved it last where it holds; None before anything has."""
    raise NotImplementedError


def moved_by(threads: Threads, line: int, column: int = 1) -> Stretches:
    """The fibers that a line of the text moves, and when: an entry, a phrase's line, the head of a phrase or section."""
    raise NotImplementedError
