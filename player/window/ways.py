"""What the window is given by whoever opens it: the ways to a run, and what a run is about."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.score.model import Score
from composer.score.tempo import TempoMap
from composer.tracks import Tracks
from composer.warp import UNWARPED, Warp
from player.engine.process.client import Client


@dataclass(frozen=True, slots=True, eq=False)
class Material:
    """What a run plays, as read from its files; None where they are not there, or say something else by now.

    rig, abilities: to draw it; tempo, warp: for bars and counts; tracks: to foretell it; score: its phrases and groups
    map_path: of the map; score_path: of the score as written, "" without one; take_path: where takes go, "" where none are made
    note: for the operator, what is not known and why
    """

    rig: Rig | None = None
    abilities: Abilities | None = None
    tempo: TempoMap | None = None
    warp: Warp = UNWARPED
    tracks: Tracks | None = None
    score: Score | None = None
    map_path: str = ""
    score_path: str = ""
    take_path: str = ""
    note: str = ""


@dataclass(frozen=True, slots=True)
class RunRow:
    """A run of this user that one may attach to; says: state, place, what, and whether it is commanded."""

    name: str
    says: str


Made = tuple[Client, Callable[[], Material]]
"""A run, and what reads the files that it plays."""


def _no_simulation(path: str) -> Made:
    raise OSError("nothing is simulated here")


@dataclass(frozen=True, slots=True)
class Ways:
    """The ways to a run. Those that return a client may take long, and raise what `link.WRONG` has.

    begin: a new run, None where none was asked for; attach: to the run of that name; runs: which there are
    simulate: a score's file on the simulator, as a run of its own; compose: opens a file in the compose window, why not
    from_s: where playing begins unless another place is chosen; title: what `begin` begins, for a list
    """

    begin: Callable[[], Made] | None
    attach: Callable[[str], Made]
    runs: Callable[[], Sequence[RunRow]] = lambda: ()
    simulate: Callable[[str], Made] = _no_simulation
    compose: Callable[[str], str] = lambda path: "compose is not at hand"
    from_s: float = 0.0
    title: str = ""


def groups_of_run(about: dict[str, Any], material: Material) -> dict[str, list[int]]:
    """Groups by name: as the run tells them, or else those of the rig."""
    told = {name: list(of) for name, of in about.get("groups", ())}
    if told or material.rig is None:
        return told
    return {name: list(of) for name, of in material.rig.groups.items()}


def fits(material: Material, about: dict[str, Any]) -> bool:
    """Whether a rig as read is the one of the run: the same fibers, of the same stroke."""
    if material.rig is None or material.abilities is None:
        return False
    names = [fiber.name for fiber in material.rig.fibers]
    return names == about["fibers"] and bool(np.allclose(material.abilities.stroke, about["stroke"], rtol=1e-6))


@dataclass(slots=True)
class Told:
    """What a run has told the window so far; lines: of the log; since: those of them that the run said since it was armed."""

    about: dict[str, Any] = field(default_factory=dict)
    marks: dict[str, Any] | None = None
    inputs: dict[str, Any] = field(default_factory=dict)
    rule: str = ""
    taken: bool = False
    last: tuple[str, dict[str, Any]] | None = None
    lines: list[str] = field(default_factory=list)
    since: list[str] = field(default_factory=list)
