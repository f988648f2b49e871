"""The folder in which runs of this user listen, readable by that user alone; which runs there are."""

import os
import re
import socket
import stat
import warnings
from contextlib import suppress

ENDING = ".run"
LONGEST_PATH = 100
"""Bytes of a local socket's path that every system takes."""

_NAME = re.compile(r"[A-Za-z0-9_.-]+-(?P<pid>[0-9]+)")


class NoRoom(Exception):
    """There is no folder for the socket; the text says why. A run goes on without it, but nobody can attach."""


def folder() -> str:
    """The folder, made where it is missing. Raises NoRoom where it is not this user's alone."""
    from platformdirs import user_runtime_path

    path = ""
    try:
        with warnings.catch_warnings():
            # Where the system has no such folder of its own, there is another; that is nothing to be warned of.
            warnings.simplefilter("ignore")
            path = str(user_runtime_path("drawcord", appauthor=False))
        above = os.path.dirname(path)
        os.makedirs(above, mode=0o700, exist_ok=True)
        over = os.stat(above)
        if over.st_uid not in (0, os.geteuid()) or (over.st_mode & 0o022 and not over.st_mode & stat.S_ISVTX):
            raise NoRoom(f"others may write into {above}")
        with suppress(FileExistsError):
            os.mkdir(path, 0o700)
        found = os.lstat(path)
        if not stat.S_ISDIR(found.st_mode) or found.st_uid != os.geteuid():
            raise NoRoom(f"{path} is not a folder of yours")
        if stat.S_IMODE(found.st_mode) != 0o700:
            os.chmod(path, 0o700)
    except OSError as why:
        raise NoRoom(f"{path or why}: {why.strerror or why}") from None
    return path


def name_for(played: str) -> str:
    """A name for a run of this process."""
    stem = re.sub(r"[^A-Za-z0-9_-]+", "-", os.path.basename(played).split(".")[0]).strip("-")[:24]
    return f"{stem or 'run'}-{os.getpid()}"


def listen(name: str) -> socket.socket:
    """A socket that listens under that name. Raises NoRoom."""
    if not hasattr(socket, "AF_UNIX"):
        raise NoRoom("this system has no local sockets")
    sweep()
    path = os.path.join(folder(), name + ENDING)
    if len(os.fsencode(path)) > LONGEST_PATH:
        raise NoRoom(f"{path} is too long for a local socket; set XDG_RUNTIME_DIR to a shorter folder")
    made = socket.socket(socket.AF_UNIX, socket.SOCK_STREAM)
    was = os.umask(0o177)
    try:
        with suppress(FileNotFoundError):
            os.unlink(path)
        made.bind(path)
        made.listen(16)
    except OSError as why:
        made.close()
        raise NoRoom(f"{path}: {why.strerror or why}") from None
    finally:
        os.umask(was)
    return made


def runs() -> tuple[str, ...]:
    """Names of this user's runs, oldest first. Raises NoRoom."""
    sweep()
    at = folder()
    found = [entry for entry in os.scandir(at) if entry.name.endswith(ENDING) and _listens(entry.path)]
    return tuple(entry.name.removesuffix(ENDING) for entry in sorted(found, key=_began_s))


def _began_s(entry: os.DirEntry[str]) -> float:
    """When a run's socket was made; one that has ended in between comes last."""
    try:
        return entry.stat().st_mtime
    except OSError:
        return float("inf")


def _listens(path: str) -> bool:
    """Whether somebody listens there; where nobody ever will again the socket is done away with."""
    with socket.socket(socket.AF_UNIX, socket.SOCK_STREAM) as tried:
        tried.setblocking(False)
        try:
            tried.connect(path)
        except ConnectionRefusedError:
            with suppress(OSError):
                os.unlink(path)
            return False
        except OSError:
            # It is there, and busy.
            return True
    return True


def path_of(name: str) -> str:
    """Where the run of that name listens; a path is itself."""
    return name if os.sep in name else os.path.join(folder(), name + ENDING)


def sweep() -> None:
    """Away with sockets whose run was killed."""
    at = folder()
    for name in os.listdir(at):
        known = _NAME.fullmatch(name.removesuffix(ENDING))
        if not name.endswith(ENDING) or known is None:
            continue
        try:
            os.kill(int(known["pid"]), 0)
        except (ProcessLookupError, OverflowError):
            with suppress(OSError):
                os.unlink(os.path.join(at, name))
        except OSError:
            continue
