"""Map files on disk: read for a rig and a score, and given another bind."""

import os

from composer.files import read_text, replacing
from composer.rig.model import Rig
from composer.rig.schema import MOST_BYTES
from composer.rig.select import Selector
from composer.score.model import Score
from composer.score.names import groups_of
from player.inputs.learn import learned
from player.inputs.map_file import read_map
from player.inputs.model import Control, Map


def load_map(path: str | os.PathLike[str], rig: Rig, score: Score | None = None) -> Map:
    """The map of a file, its names looked up in a rig and in the score, if any, that is played. Raises `Faults`."""
    name = os.fspath(path)
    return _read(read_text(name, MOST_BYTES), name, rig, score)


def learn_into(path: str | os.PathLike[str], control: Control, deed: str, rig: Rig, score: Score | None = None) -> Map:
    """Add a bind to a map file, which need not be there yet, and return the map as it then is. Raises `Faults`.

    deed: lines of the bind beside its control, such as `fibers = "reeds"`; nothing is written where they are wrong
    """
    name = os.fspath(path)
    text = read_text(name, MOST_BYTES) if os.path.exists(name) else ""
    longer = learned(text, _read(text, name, rig, score), control, deed)
    map_ = _read(longer, name, rig, score)
    with replacing(name) as file:
        file.write(longer)
    return map_


def _read(text: str, name: str, rig: Rig, score: Score | None) -> Map:
    selector = Selector(rig, groups_of(score) if score is not None else {})
    return read_map(text, name, selector, score.phrases if score is not None else ())
