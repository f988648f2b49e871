"""What tests of edits share: texts made into what follows from them, and the demo scores."""

from functools import cache
from importlib.resources import files

from composer.load import Loaded, load_score, made_from
from composer.rig.model import Rig
from composer.score.reading import read_score

DEMOS = ("estuary", "gannet")


def path_of(name: str) -> str:
    return str(files("scores_demo").joinpath(f"{name}.score"))


@cache
def text_of(name: str) -> str:
    with open(path_of(name), encoding="utf-8") as file:
        return file.read()


@cache
def demo(name: str) -> Loaded:
    return load_score(path_of(name))


def made(text: str, rig: Rig, used: dict[str, str] | None = None) -> Loaded:
    """What follows from a text on a rig; Faults where it cannot be read."""
    return made_from(read_score(text, "t.score", None if used is None else used.__getitem__), rig)
