"""Takes on disk: appended to as they are played, so that what was played up to any instant is there whatever happens."""

import os

import numpy as np
from numpy.typing import NDArray

from composer.faults import fault
from composer.files import read_bytes
from composer.rig.model import Rig
from player.takes.form import Recorder, Take, read_take

MOST_BYTES = 1 << 30
"""A take of more bytes is refused: three hours and a half of 48 fibers that never stand still."""


class TakeFile:
    """A take that is being recorded into a file of its own; every record is handed to the system whole, at once."""

    def __init__(self, path: str, rig: Rig, score: str = "", rate_Hz: float = 200.0, date: str = ""):
        """Begin a take; raises Faults where there is a file already, or none can be made."""
        self.path, self._bytes = path, 0
        try:
            self._handle = os.open(path, os.O_WRONLY | os.O_CREAT | os.O_EXCL | os.O_APPEND | getattr(os, "O_BINARY", 0), 0o666)
        except FileExistsError:
            raise fault(
                path, "there is a file already, and a take is never written over another", hint="name a new file"
            ) from None
        except (OSError, ValueError) as error:
            why = getattr(error, "strerror", None) or "this is no possible file name"
            raise fault(path, f"cannot write: {why}") from None
        folder = os.path.dirname(os.path.abspath(path))
        names = tuple(fiber.name for fiber in rig.fibers)
        self.recorder = Recorder(
            self._append, names, rig=_from(folder, rig.file), score=_from(folder, score), fingerprint=rig.fingerprint,
            rate_Hz=rate_Hz, date=date,
        )  # fmt: skip

    @property
    def broken(self) -> str:
        """Why recording has stopped, "" while it goes on."""
        return self.recorder.broken

    def input(self, time_s: float, source: str, control: str, value: float) -> None:
        """Something that a controller sent."""
        self.recorder.input(time_s, source, control, value)

    def sample(self, time_s: float, wanted: NDArray[np.float64], governed: NDArray[np.float64]) -> bool:
        """A tick: time in the score in s, strains (F,) as asked for and as let through; whether it was taken."""
        return self.recorder.sample(time_s, wanted, governed)

    def close(self) -> None:
        """End the take; it is on the disk then."""
        if self._handle < 0:
            return
        self.recorder.end()
        handle, self._handle = self._handle, -1
        try:
            os.fsync(handle)
        except OSError as error:
            self.recorder.broken = self.recorder.broken or error.strerror or str(error)
        finally:
            os.close(handle)

    def _append(self, data: bytes) -> None:
        if self._bytes + len(data) > MOST_BYTES:
            raise OSError(f"the take has {MOST_BYTES >> 20} MiB, which is the most that one may have")
        view = memoryview(data)
        while view:
            view = view[os.write(self._handle, view) :]
        self._bytes += len(data)


def _from(folder: str, path: str) -> str:
    if not path:
        return ""
    try:
        return os.path.relpath(path, folder).replace(os.sep, "/")
    except ValueError:  # on another drive there is no relative way
        return os.path.abspath(path)


def load_take(path: str) -> Take:
    """The take of a file, up to its last whole record. Raises Faults."""
    return read_take(read_bytes(path, MOST_BYTES), path)


def rig_of(take: Take, path: str, rig: Rig) -> Rig:
    """The rig, if it is the one that the take was played on. Raises Faults."""
    names = tuple(fiber.name for fiber in rig.fibers)
    if rig.fingerprint != take.fingerprint or names != take.fibers:
        raise fault(
            path,
            f"this take was played on another rig than {rig.file} is now",
            f"the rig with fingerprint {take.fingerprint & 0xFFFFFFFF:08x}",
            "name the rig as it was with --rig",
        )
    return rig
