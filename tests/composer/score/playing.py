"""What tests of expansion share: a text to tracks in one call, and one fiber's knots in the open."""

from dataclasses import dataclass, replace

import numpy as np

from composer.limits.abilities import Abilities, abilities_of
from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.expand import expand
from composer.score.names import groups_of
from composer.score.reading import read_score
from composer.tracks import Tracks, end_strain


@dataclass(frozen=True)
class Thread:
    """One fiber's knots as lists."""

    time_s: list[float]
    manner: list[int]
    shape: list[int]
    start: list[float]
    end: list[float]
    line: list[int]
    phrase_line: list[int]


def played(text: str, rig: Rig, abilities: Abilities | None = None) -> Tracks:
    """The tracks of a score's text."""
    score = read_score(text, "t.score")
    return expand(score, rig, abilities or abilities_of(rig), Selector(rig, groups_of(score)))


def thread(tracks: Tracks, fiber: int) -> Thread:
    """One fiber's knots, rounded to what a test wants to write down."""
    mine = slice(tracks.first[fiber], tracks.first[fiber + 1])

    def told(values: np.ndarray) -> list:
        return [round(value, 12) + 0.0 for value in values[mine].tolist()]

    return Thread(
        told(tracks.time_s),
        tracks.manner[mine].tolist(),
        tracks.shape[mine].tolist(),
        told(tracks.curve[:, 0]),
        told(end_strain(tracks)),
        tracks.line[mine].tolist(),
        tracks.phrase_line[mine].tolist(),
    )


def faster_when_full(abilities: Abilities, points: int = 5) -> Abilities:
    """The same fibers with rates that rise with strain, so that a sudden move's time depends on where it is."""
    count = len(abilities.strain)
    rise = np.linspace(1.0, 3.0, points)
    return replace(
        abilities,
        strain=np.linspace(0.0, abilities.strain[:, -1], points).T.reshape(count, points),
        fill=np.outer(abilities.fill[:, 0], rise),
        exhaust=np.outer(abilities.exhaust[:, 0], rise),
        air_L=np.outer(abilities.air_L[:, -1], np.linspace(0.0, 1.0, points)),
    )
