"""What the fibers will do tonight, worked out in a process beside the window."""

from collections.abc import Callable

from composer.limits.abilities import Abilities
from composer.report.tonight import foretold, sentences
from composer.rig.model import Rig
from composer.score.tempo import TempoMap
from composer.tracks import Tracks
from composer.warp import Warp


def foretell(
    tracks: Tracks, rig: Rig, abilities: Abilities, tempo: TempoMap | None, warp: Warp, tell: Callable[[object], None]
) -> None:
    """A whole run on the simulated rig; tells the share that is done, a float, then its sentences, a list of str."""

    def say_place(at_s: float) -> str:
        return tempo.say_place(warp.was(at_s)) if tempo is not None else f"{at_s:.1f}s"

    tell(sentences(foretold(tracks, rig, abilities, say_place, tell)))
