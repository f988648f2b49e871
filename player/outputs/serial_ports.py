"""The serial ports of this machine, and the simulated boards that run on it."""

import json
import os
import stat
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path


@dataclass(frozen=True, slots=True)
class Port:
    """A port: its path, what is known about it, and "serial" or "simulated"."""

    path: str
    says: str
    kind: str


def ports_found() -> list[Port]:
    """Serial ports with hardware behind them, then simulated boards, each by path."""
    from serial.tools import list_ports

    found = []
    for port in list_ports.comports():
        known = [port.description if port.description not in ("n/a", None) else "", port.manufacturer or ""]
        if port.vid is not None:
            known.append(
                f"USB {port.vid:04x}:{port.pid:04x}" + (f", serial number {port.serial_number}" * bool(port.serial_number))
            )
        found.append(Port(port.device, ", ".join(dict.fromkeys(part for part in known if part)), "serial"))
    return sorted(found, key=lambda port: port.path) + simulated_boards()


def simulated_boards() -> list[Port]:
    """The simulated boards of this user that run now."""
    found = []
    folder = _folder()
    for note in sorted(folder.glob("board-*.json")) if _is_ours(folder) else []:
        try:
            os.kill(int(note.stem.partition("-")[2]), 0)
            told = json.loads(note.read_text(encoding="utf-8"))
            if os.path.exists(told["path"]):
                found.append(Port(str(told["path"]), str(told["says"]), "simulated"))
        except ProcessLookupError:
            with suppress(OSError):
                note.unlink()
        except (OSError, ValueError, KeyError, TypeError):
            continue
    return found


@contextmanager
def announced(path: str, says: str) -> Iterator[None]:
    """While the block runs, this process's simulated board is found by others of the same user."""
    folder = _folder()
    note = folder / f"board-{os.getpid()}.json"
    with suppress(OSError):
        folder.mkdir(mode=0o700, exist_ok=True)
        if _is_ours(folder):
            note.write_text(json.dumps({"path": path, "says": says}), encoding="utf-8")
    try:
        yield
    finally:
        with suppress(OSError):
            note.unlink()


def _folder() -> Path:
    base = os.environ.get("XDG_RUNTIME_DIR") or tempfile.gettempdir()
    return Path(base) / f"drawcord-boards-{os.getuid()}"


def _is_ours(folder: Path) -> bool:
    """Whether the folder is this user's own, so that nobody else put notes there."""
    try:
        looks = folder.lstat()
    except OSError:
        return False
    return stat.S_ISDIR(looks.st_mode) and looks.st_uid == os.getuid() and not looks.st_mode & 0o022
