"""The files of the window: takes of a session, free names, a map that is read and written whole."""

import os
import shutil
import tempfile
from dataclasses import dataclass

from composer.files import read_text, replacing
from composer.rig.model import Rig
from composer.rig.schema import MOST_BYTES
from composer.rig.select import Selector
from composer.score.model import Score
from composer.score.names import groups_of
from player.engine.clock import time_of
from player.inputs.load import learn_into, load_map
from player.inputs.map_file import read_map
from player.inputs.model import NO_MAP, Control, Map, Stroke
from player.live.takes import SUFFIX
from player.window.map_text import OTHER_DEEDS, bind_of, changed


@dataclass(frozen=True, slots=True)
class TakeRow:
    """A take on the disk: its path, and its size in bytes."""

    path: str
    size: int


def takes_since(out: str, began: str) -> list[TakeRow]:
    """Takes recorded beside the score `out` from a moment on, as a run's `about` tells it; oldest first."""
    folder, name = os.path.split(os.path.abspath(out))
    stem = os.path.splitext(name)[0]
    try:
        since = time_of(began) - 1.0
    except ValueError:
        since = 0.0
    found = []
    try:
        for entry in os.scandir(folder):
            base, ending = os.path.splitext(entry.name)
            number = base.removeprefix(stem + "-")
            if ending == SUFFIX and (base == stem or (base != number and number.isdigit())):
                told = entry.stat()
                if told.st_mtime >= since:
                    found.append((told.st_ctime, int(number) if number.isdigit() else 1, TakeRow(entry.path, told.st_size)))
    except OSError:
        return []
    return [row for _, _, row in sorted(found, key=lambda one: one[1])]


def free_name(stem: str) -> str:
    """A score's path that is free: the stem, or the stem and a number."""
    path, number = f"{stem}.score", 1
    while os.path.exists(path):
        number += 1
        path = f"{stem}-{number}.score"
    return path


def scratch() -> str:
    """A folder for a while."""
    return tempfile.mkdtemp(prefix="drawcord-")


def away(folder: str) -> None:
    """Have done with such a folder."""
    shutil.rmtree(folder, ignore_errors=True)


def map_at(path: str, rig: Rig, score: Score | None) -> Map:
    """The map of a file; one without binds where it is not there yet. Raises Faults."""
    return load_map(path, rig, score) if os.path.exists(path) else NO_MAP


def bind(path: str, control: Control, fibers: str, rig: Rig, score: Score | None) -> tuple[Map, int]:
    """Have a control move fibers: another bind, or the one that it has changed; the map as it then is, and which it is.

    Raises Faults; nothing is written then.
    """
    before = map_at(path, rig, score)
    index = bind_of(before, control)
    written = fibers.replace("\\", "\\\\").replace('"', '\\"')
    if index is None:
        made = learn_into(path, control, f'fibers = "{written}"\npickup = true', rig, score)
        return made, len(made.binds) - 1
    values: dict[str, str | None] = {"fibers": f'"{written}"'}
    if not isinstance(before.binds[index].deed, Stroke):
        values |= dict.fromkeys(OTHER_DEEDS)
    return change(path, index, values, rig, score), index


def change(path: str, index: int, values: dict[str, str | None], rig: Rig, score: Score | None) -> Map:
    """Other values for keys of a bind, all else of the file as it was. Raises Faults; nothing is written then."""
    text = read_text(path, MOST_BYTES)
    before = load_map(path, rig, score)
    longer = changed(text, before, index, values)
    selector = Selector(rig, groups_of(score) if score is not None else {})
    after = read_map(longer, path, selector, score.phrases if score is not None else ())
    with replacing(path) as file:
        file.write(longer)
    return after
