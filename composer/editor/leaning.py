"""The files that a score leans on, its rig and those it uses: read when they have changed, and only then."""

import os
from collections.abc import Callable
from typing import Any

from composer.editor.messages import FileStamp
from composer.faults import Faults
from composer.files import read_text
from composer.limits.abilities import Abilities, abilities_of
from composer.load import load_rig
from composer.rig.model import Rig
from composer.score.bounds import most


def stamp(path: str) -> FileStamp:
    """How a file stands now."""
    try:
        found = os.stat(path)
    except (OSError, ValueError):
        return FileStamp(path, 0, 0)
    return FileStamp(path, found.st_mtime_ns, found.st_size)


class Leaning:
    """What was read of other files, each with its stamp; a rig that cannot be read any more leaves the last that could."""

    def __init__(self) -> None:
        self.number = 0
        self.rig: Rig | None = None
        self.abilities: Abilities | None = None
        self._rig_path = ""
        self._read: dict[str, tuple[FileStamp, Any, Faults | None]] = {}
        self._used: dict[str, FileStamp] = {}

    def forget(self) -> None:
        """The rig at hand is that of another score."""
        self.rig, self.abilities, self._rig_path = None, None, ""

    def begin(self) -> None:
        """From here on `leans_on` gathers anew."""
        self._used = {}

    @property
    def leans_on(self) -> tuple[FileStamp, ...]:
        """All files asked for since `begin`, as they stood."""
        return tuple(self._used.values())

    def text(self, path: str) -> str:
        """The text of a used file. Raises Faults."""
        return self._known(path, lambda: read_text(path, most("file")))

    def take_rig(self, path: str) -> Faults | None:
        """Have the rig of a file, if it can be had; what is wrong with it, where it cannot.

        A rig of the same file that could be read before stays; one of another file does not stand in for it.
        """
        if path != self._rig_path:
            self.rig, self.abilities, self._rig_path = None, None, path
        try:
            rig = self._known(path, lambda: load_rig(path))
        except Faults as wrong:
            return wrong
        if rig is not self.rig:
            self.rig, self.abilities = rig, abilities_of(rig)
            self.number += 1
        return None

    def _known(self, path: str, read: Callable[[], Any]) -> Any:
        now = stamp(path)
        self._used[path] = now
        was = self._read.get(path)
        if was is None or was[0] != now:
            try:
                was = (now, read(), None)
            except Faults as wrong:
                was = (now, None, wrong)
            self._read[path] = was
        if was[2] is not None:
            raise was[2]
        return was[1]
