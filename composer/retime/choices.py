"""What the composer has chosen for parts of a score: what they keep, and how firmly they stand."""

import numpy as np
from numpy.typing import NDArray

from composer.score.model import Score
from composer.tracks import Tracks


def choices_of(score: Score, tracks: Tracks, keep: str) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
    """For each segment how many times as costly it is to move, and whether it keeps rhythm, (K,) each.

    keep: what segments keep whose section does not say; a section's factor and an entry's are multiplied.
    """
    lines = max([int(tracks.line.max(initial=0)), *(entry.span.line for part in score.sections for entry in part.entries)])
    firm = np.ones(lines + 1)
    rhythm = np.full(lines + 1, keep == "rhythm")
    for section in score.sections:
        for entry in section.entries:
            firm[entry.span.line] = float(section.firm) * float(entry.firm)
            rhythm[entry.span.line] = (section.keep or keep) == "rhythm"
    return firm[tracks.line], rhythm[tracks.line]
