"""What the compose window has on disk: the score itself, the file of recovery, and the claim that keeps two windows apart.

All that touches a file is here, in `composer.load` and in `composer.files`; the rules are in `composer.editor.recovery`.
"""

import os
import sys
from collections.abc import Iterable
from contextlib import suppress
from dataclasses import dataclass
from importlib.resources import files
from itertools import islice
from pathlib import Path

from platformdirs import user_config_dir, user_state_dir

from composer.editor import recovery
from composer.editor.deltas import Delta
from composer.editor.recovery import Recovered
from composer.faults import Faults
from composer.files import read_bytes, read_text, replacing
from composer.score.bounds import most

CRLF, LF = "\r\n", "\n"


@dataclass(frozen=True, slots=True)
class Stamp:
    """How a file stood: another of these means that somebody else has written it."""

    changed_ns: int
    size: int
    number: int


@dataclass(frozen=True, slots=True)
class Read:
    """A file's text with plain line feeds, how its lines ended, whether all ended alike, and how it stood."""

    text: str
    line_end: str
    mixed: bool
    stamp: Stamp | None


def stamp_of(path: str) -> Stamp | None:
    """How a file stands now; None where it is not there."""
    try:
        found = os.stat(path)
    except (OSError, ValueError):
        return None
    return Stamp(found.st_mtime_ns, found.st_size, found.st_ino)


def read_score(path: str) -> Read:
    """The text of a score. Raises Faults."""
    before = stamp_of(path)
    text = read_text(path, most("file"))
    windows = text.count(CRLF)
    plain = text.replace(CRLF, LF).replace("\r", LF)
    ends = plain.count(LF)
    return Read(plain, CRLF if windows and windows * 2 > ends else LF, windows not in (0, ends), before)


def write_score(path: str, text: str, line_end: str = LF) -> Stamp | None:
    """Save a text: into a new file that takes the old one's place when it is whole. Raises Faults; the old file then stays."""
    with replacing(path, "wb") as file:
        file.write((text.replace(LF, line_end) if line_end != LF else text).encode("utf-8", "replace"))
    return stamp_of(path)


def may_write(path: str) -> bool:
    """Whether a file could be saved here, as far as permissions tell."""
    target = path if os.path.exists(path) else os.path.dirname(os.path.abspath(path))
    return os.access(target, os.W_OK) and os.access(os.path.dirname(os.path.abspath(path)), os.W_OK)


MOST_LOOKED_AT, MOST_FOLDERS = 5000, 50
"""Entries of a folder, and folders in it, that are looked at."""


def paths_in(folder: str, typed: str, ending: str) -> list[str]:
    """Files of an ending, and folders with a / behind, in the folder that a half-typed path leads to; as paths from `folder`.

    Where nothing is typed of a folder, the files of the folders below are among them too; hidden ones are left out.
    """
    lead = typed[: typed.rfind("/") + 1]
    found, folders = _looked_at(os.path.join(folder, lead), ending)
    if not lead:
        below = [
            f"{name}/{one}" for name in folders[:MOST_FOLDERS] for one in _looked_at(os.path.join(folder, name), ending)[0]
        ]
        return found + below
    return [lead + name for name in found] + [f"{lead}{name}/" for name in folders]


def _looked_at(folder: str, ending: str) -> tuple[list[str], list[str]]:
    """The names of a folder's files of an ending, and of its folders, in order; of one that cannot be read, none."""
    found: list[str] = []
    folders: list[str] = []
    with suppress(OSError, ValueError), os.scandir(folder) as entries:
        for entry in islice(entries, MOST_LOOKED_AT):
            if entry.name.startswith("."):
                continue
            if entry.is_dir():
                folders.append(entry.name)
            elif entry.name.endswith(ending):
                found.append(entry.name)
    return sorted(found), sorted(folders)


def folder_of(what: str) -> str:
    """A folder of this program's own for what lasts from one start to the next; made where it is missing."""
    base = os.environ.get("DRAWCORD_STATE") or user_state_dir("drawcord", appauthor=False)
    folder = os.path.join(base, "compose", what)
    with suppress(OSError):
        os.makedirs(folder, mode=0o700, exist_ok=True)
    return folder


def settings_path() -> str:
    """The file in which the window keeps its sizes and its manners."""
    base = os.environ.get("DRAWCORD_STATE") or user_config_dir("drawcord", appauthor=False)
    return os.path.join(base, "compose.ini")


def recovery_path(path: str) -> str:
    """Where the changes of a score are kept until it is saved: beside it, or with the program where that cannot be written."""
    whole = os.path.abspath(path)
    folder, name = os.path.split(whole)
    if os.access(folder, os.W_OK):
        return recovery.name_beside(os.path.join(folder, ""), name)
    return os.path.join(folder_of("unsaved"), f"{name}-{recovery.hash_of(whole)[:12]}{recovery.ENDING}")


def untitled_path() -> str:
    """A new place for the changes of a text that has no file yet."""
    return os.path.join(folder_of("unsaved"), f"untitled-{os.getpid()}-{os.urandom(4).hex()}{recovery.ENDING}")


def left_behind(paths: Iterable[str] = ()) -> list[tuple[str, Recovered]]:
    """The texts that no window has any more: of such files of recovery, or of all that never had a name; newest first."""
    found = []
    folder = folder_of("unsaved")
    there = list(paths) or [str(path) for path in Path(folder).glob(f"untitled-*{recovery.ENDING}")]
    for path in sorted(there, key=lambda one: -(stamp.changed_ns if (stamp := stamp_of(one)) else 0)):
        if Claim.is_held(path):
            continue
        with suppress(Faults):
            read = recovery.read(read_bytes(path, recovery.MOST_BYTES))
            if read is not None:
                found.append((path, read))
    return found


def write_bytes(path: str, data: bytes) -> None:
    """Write a file whole, or not at all. Raises Faults."""
    with replacing(path, "wb") as file:
        file.write(data)


def copy(source: str, target: str) -> None:
    """Copy a file of text to where there is none. Raises Faults."""
    data = read_bytes(source, most("file"))
    with replacing(target, "wb") as file:
        file.write(data)


def remove(path: str) -> None:
    """Remove a file if it is there."""
    with suppress(OSError):
        os.unlink(path)


class Keeping:
    """An open file of recovery: begun with a whole text, then change after change."""

    def __init__(self, path: str, of: str, saved: str, text: str):
        """Write the whole text into a new file that takes the place of one that is there. Raises OSError."""
        self.path = path
        self._new = f"{path}.{os.urandom(4).hex()}.new"
        self._handle = os.open(self._new, os.O_WRONLY | os.O_CREAT | os.O_TRUNC | getattr(os, "O_BINARY", 0), 0o600)
        self._dirty = True
        try:
            for line in recovery.begin(of, saved, text):
                self._write(line)
        except OSError:
            self.drop()
            raise

    @property
    def dirty(self) -> bool:
        """Whether something was written that may not have reached the disk itself."""
        return self._dirty

    def drop(self) -> None:
        """Let go of a file that has not taken its place, and remove it."""
        self.close()
        remove(self._new)

    def take_place(self) -> None:
        """From now on this is the file of recovery. Raises OSError."""
        os.replace(self._new, self.path)

    def add(self, delta: Delta) -> None:
        """Keep one change; it has left this process when this returns. Raises OSError."""
        self._write(recovery.change(delta))

    def sync(self) -> None:
        """Have all that was written reach the disk itself. Raises OSError."""
        if self._dirty and self._handle >= 0:
            self._dirty = False
            os.fsync(self._handle)

    def close(self) -> None:
        """Let go of the file."""
        if self._handle >= 0:
            os.close(self._handle)
            self._handle = -1

    def _write(self, data: bytes) -> None:
        self._dirty = True
        while data:
            data = data[os.write(self._handle, data) :]


class Claim:
    """That this process has a file of recovery open: a lock that the system takes back however the process ends."""

    def __init__(self, path: str):
        self._path = _lock_path(path)
        self._handle = -1

    def take(self) -> bool:
        """Take it, if no other process has it. Where locks cannot be had at all, all is as if nobody else were there."""
        if self._handle >= 0:
            return True
        try:
            handle = os.open(self._path, os.O_RDWR | os.O_CREAT, 0o600)
        except OSError:
            return True
        if not _locked(handle):
            os.close(handle)
            return False
        self._handle = handle
        return True

    def drop(self) -> None:
        """Give it back."""
        if self._handle >= 0:
            remove(self._path)
            os.close(self._handle)
            self._handle = -1

    @staticmethod
    def is_held(path: str) -> bool:
        """Whether some process has it."""
        try:
            handle = os.open(_lock_path(path), os.O_RDWR)
        except OSError:
            return False
        try:
            return not _locked(handle)
        finally:
            os.close(handle)


def _lock_path(path: str) -> str:
    return os.path.join(folder_of("open"), recovery.hash_of(os.path.realpath(path))[:24])


def _locked(handle: int) -> bool:
    """Lock a file that is open; False where another process has done so."""
    try:
        if sys.platform == "win32":
            import msvcrt

            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        else:
            import fcntl

            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError as error:
        return not isinstance(error, (BlockingIOError, PermissionError))
    return True


DEMO = "estuary"


def demo() -> tuple[str, str]:
    """The text of *Estuary*, and the folder in which its rig lies."""
    score = files("scores_demo").joinpath(f"{DEMO}.score")
    return score.read_text("utf-8"), os.path.dirname(str(score))
