"""Files at the edge: bounded reads, and writes that replace their target only when they are complete."""

import errno
import os
import secrets
import shutil
import stat
from codecs import BOM_UTF8
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from typing import IO, Any, NoReturn

from composer.faults import Fault, Faults, Where, fault

_FULL = {errno.ENOSPC, errno.EDQUOT, errno.EFBIG, errno.EIO, errno.EROFS}
_HANDWRITING = {".score": "a score", ".rig.toml": "a rig file", ".map.toml": "a map file"}
"""Endings of the files that people write."""

_STARTS = {
    b"PK\x03\x04": ("a play file, or an archive of another kind", "'drawcord play' and 'drawcord preview' take play files"),
    b"drawcrec": ("a recording", "'drawcord play' plays it"),
    b"drawctak": ("a take", "'drawcord take' makes a score of it"),
    b"drawclog": ("the log of a run", "'drawcord report' tells it"),
    b"MThd": ("a MIDI file", "'drawcord tempo' reads it"),
    b"\x89PNG": ("a picture", ""),
}
"""How files begin that are taken for scores and rigs now and then, and what does take them."""

_MOST_TRIES = 100
"""How often a folder is emptied that somebody still fills."""

_MARKS = {b"\xff\xfe": "UTF-16", b"\xfe\xff": "UTF-16"}


def read_bytes(path: str | os.PathLike[str], limit_bytes: int) -> bytes:
    """The whole of an ordinary file of at most `limit_bytes`; whatever hinders that is raised as `Faults`."""
    name = os.fspath(path)
    try:
        # A pipe without a writer would keep open() waiting for ever; the look at what it is comes first.
        _refuse_what_is_no_file(name, os.stat(name))
        with open(name, "rb") as file:
            data = file.read(limit_bytes + 1)
    except (OSError, ValueError) as error:
        _cannot("read", name, error)
    if len(data) > limit_bytes:
        raise fault(name, f"the file has more than {say_bytes(limit_bytes)}", f"at most {say_bytes(limit_bytes)}")
    return data


def read_text(path: str | os.PathLike[str], limit_bytes: int) -> str:
    """The text of a UTF-8 file of at most `limit_bytes`, without a byte order mark; line ends stay as they are.

    Raises `Faults` for a file that is missing, a folder, forbidden, too large, binary or not UTF-8; the last two
    with line, column and byte offset.
    """
    name = os.fspath(path)
    data = read_bytes(name, limit_bytes)
    if data[:2] in _MARKS:
        raise fault(name, f"the file is {_MARKS[data[:2]]} text", "UTF-8 text", "save it again with the encoding UTF-8")
    zero = data.find(b"\0")
    if zero >= 0:
        zeros = f"a zero byte at offset {zero}: this is a binary file"
        known = (("this is " + what, where) for start, (what, where) in _STARTS.items() if data.startswith(start))
        what, hint = next(known, (zeros, ""))
        raise fault(name, f"{what}, not text", "UTF-8 text", hint)
    mark = len(BOM_UTF8) if data.startswith(BOM_UTF8) else 0
    try:
        return data[mark:].decode()
    except UnicodeDecodeError as error:
        raise Faults([_not_utf8(name, data, mark + error.start)]) from None


def _not_utf8(name: str, data: bytes, offset: int) -> Fault:
    """The fault of a byte that is no UTF-8, at its line and column."""
    start = data.rfind(b"\n", 0, offset) + 1
    end = data.find(b"\n", offset)
    line = data.count(b"\n", 0, offset) + 1
    before = data[start:offset].decode("utf-8-sig", "replace")
    text = data[start : end if end >= 0 else len(data)].decode("utf-8-sig", "replace").rstrip("\r")
    return Fault(
        Where(name, line, len(before) + 1, 1, text),
        f"byte 0x{data[offset]:02X} at offset {offset} is not UTF-8",
        "UTF-8 text",
        "save the file again with the encoding UTF-8",
    )


@contextmanager
def replacing(path: str | os.PathLike[str], mode: str = "w") -> Iterator[IO[Any]]:
    """A file to write that takes the target's place when the block ends well; `mode` "w" (UTF-8, line feeds) or "wb".

    Until then all goes into a file beside the target, which is removed if the block fails. A link stays a link, a
    replaced file keeps its permissions; into a device or pipe (such as /dev/stdout) it is written directly. Raises
    `Faults` where it cannot be written or the disk is full.
    """
    if mode not in ("w", "wb"):
        raise ValueError(f"mode {mode!r}")
    name = os.fspath(path)
    form: dict[str, Any] = {} if mode == "wb" else {"encoding": "utf-8", "newline": "\n"}
    was = _target(name)
    if was is not None and not stat.S_ISREG(was.st_mode):
        with _saying(name), open(name, mode, **form) as file:
            yield file
        return
    target = os.path.realpath(name)
    beside = _beside(name, target)
    try:
        handle = _made(name, beside)
        with _saying(name, beside):
            with os.fdopen(handle, mode, **form) as file:
                yield file
                file.flush()
                if was is not None:
                    os.chmod(beside, stat.S_IMODE(was.st_mode))
                os.fsync(file.fileno())
            os.replace(beside, target)
    except BaseException:
        _remove(beside)
        raise
    _sync_folder(target)


@contextmanager
def replacing_by_name(path: str | os.PathLike[str]) -> Iterator[str]:
    """As `replacing`, for a program that wants a name to write to: a file in a folder beside, which takes the target's place.

    A program that outlives the block finds the folder gone, and can leave nothing. Devices and pipes are refused, as such a
    program may want to go back in what it writes.
    """
    name = os.fspath(path)
    was = _target(name)
    if was is not None and not stat.S_ISREG(was.st_mode):
        raise fault(name, "cannot write: this is a device or a pipe", "an ordinary file")
    target = os.path.realpath(name)
    folder = _beside(name, target)
    beside = os.path.join(folder, os.path.basename(target))
    try:
        with _saying(name, folder):
            os.mkdir(folder)
        with _saying(name, beside):
            yield beside
            if was is not None:
                os.chmod(beside, stat.S_IMODE(was.st_mode))
            with open(beside, "rb+") as file:
                os.fsync(file.fileno())
            os.replace(beside, target)
    finally:
        _remove_folder(folder)
    _sync_folder(target)


@contextmanager
def _saying(name: str, *also: str) -> Iterator[None]:
    """Turn what the system says of this file, or of its disk, into `Faults`; errors of other files pass as they are."""
    try:
        yield
    except OSError as error:
        if error.errno in _FULL or error.filename in (name, *also):
            _cannot("write", name, error)
        raise


def check_writable(path: str | os.PathLike[str], made: str | None = "") -> None:
    """Raise `Faults` now if `replacing(path)` would fail later: before long work starts, with nothing left behind.

    So too where a score, a rig or a map stands there that a person may have written, which is any that does not begin with
    `made`, the words with which the caller's own files begin. With None whatever stands there may go.
    """
    name = os.fspath(path)
    was = _target(name)
    if was is not None and stat.S_ISREG(was.st_mode) and made is not None:
        _spare_handwriting(name, made)
    if was is not None and not stat.S_ISREG(was.st_mode):
        if not os.access(name, os.W_OK):
            _cannot("write", name, PermissionError(errno.EACCES, os.strerror(errno.EACCES)))
        return
    beside = _beside(name, os.path.realpath(name))
    try:
        os.close(_made(name, beside))
    finally:
        _remove(beside)


def _spare_handwriting(name: str, made: str) -> None:
    """Raise where a text that somebody may have worked on would be lost to a slip of the hand; empty files are none."""
    what = next((what for ending, what in _HANDWRITING.items() if name.lower().endswith(ending)), None)
    if what is None:
        return
    try:
        with open(name, "rb") as file:
            start = file.read(max(len(made.encode()), 1))
    except OSError as error:
        _cannot("write", name, error)
    if start and not (made and start == made.encode()):
        raise fault(
            name,
            f"cannot write: there is {what} of this name already, and it would be lost",
            hint="name another file, or move that one away first",
        )


def say_bytes(count: int) -> str:
    """A count of bytes as a person reads it."""
    for size, unit in ((1 << 20, "MiB"), (1 << 10, "KiB")):
        if count >= size:
            return f"{count / size:.4g} {unit}"
    return f"{count} bytes"


def _target(name: str) -> os.stat_result | None:
    """What stands at the target now, None if nothing does; `Faults` for a folder or a file that may not be changed."""
    try:
        if not os.path.basename(name):
            raise IsADirectoryError(errno.EISDIR, os.strerror(errno.EISDIR))
        was = os.stat(name)
    except FileNotFoundError:
        return None
    except (OSError, ValueError) as error:
        _cannot("write", name, error)
    if stat.S_ISDIR(was.st_mode):
        _cannot("write", name, IsADirectoryError(errno.EISDIR, os.strerror(errno.EISDIR)))
    if stat.S_ISREG(was.st_mode) and not os.access(name, os.W_OK):
        _cannot("write", name, PermissionError(errno.EACCES, os.strerror(errno.EACCES)))
    return was


def _beside(name: str, target: str) -> str:
    """A name in the target's folder that nothing has; known before anything is made, so that whatever ends that can undo it."""
    folder = os.path.dirname(target)
    if not os.path.isdir(folder):
        raise fault(
            name,
            f"cannot write: there is no folder '{os.path.dirname(name) or folder}'",
            hint="make the folder first, or choose another place",
        )
    return os.path.join(folder, f".drawcord-{secrets.token_hex(8)}.part")


def _made(name: str, beside: str) -> int:
    """The handle of a new file, with the permissions that any new file gets."""
    try:
        return os.open(beside, os.O_WRONLY | os.O_CREAT | os.O_EXCL | getattr(os, "O_BINARY", 0), 0o666)
    except OSError as error:
        _cannot("write", name, error)


def _remove(path: str) -> None:
    """Remove a file if it is there."""
    with suppress(OSError):
        os.unlink(path)


def _remove_folder(path: str) -> None:
    """Remove a folder and what is in it, also what a program that is on its way out still puts there."""
    for _ in range(_MOST_TRIES):
        shutil.rmtree(path, ignore_errors=True)
        if not os.path.lexists(path):
            return


def _sync_folder(target: str) -> None:
    """Have the new name reach the disk too, where the system lets a folder be synced."""
    with suppress(OSError):
        handle = os.open(os.path.dirname(target), os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _refuse_what_is_no_file(name: str, what: os.stat_result) -> None:
    """Raise for folders, pipes, devices."""
    if stat.S_ISDIR(what.st_mode):
        raise IsADirectoryError(errno.EISDIR, os.strerror(errno.EISDIR))
    if not stat.S_ISREG(what.st_mode):
        raise fault(name, "cannot read: this is a device or a pipe", "an ordinary file")


_WHY = {
    errno.ENOENT: "there is no such file",
    errno.ENOTDIR: "a part of its path is a file, not a folder",
    errno.EISDIR: "this is a folder, not a file",
    errno.EACCES: "permission denied",
    errno.EPERM: "permission denied",
    errno.ENAMETOOLONG: "the name is too long",
    errno.ENOSPC: "the disk is full",
    errno.EDQUOT: "the disk quota is used up",
    errno.EROFS: "the file system is read-only",
    errno.ELOOP: "its links run in a circle",
}


def _cannot(verb: str, name: str, error: OSError | ValueError) -> NoReturn:
    """Raise the fault of an operating system's error, in plain words."""
    number = error.errno if isinstance(error, OSError) else None
    why = _WHY.get(number or 0) or (error.strerror if isinstance(error, OSError) else None) or "this is no possible file name"
    raise fault(name, f"cannot {verb}: {why}") from None
