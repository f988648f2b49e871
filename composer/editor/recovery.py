"""What is kept of a text that is not saved: its whole, then every change since, in one file that only ever grows.

A file of recovery is lines of JSON, each behind its CRC-32, so that a line cut short by a crash is known and left out:

    {"drawcord": "unsaved", "version": 1, "of": PATH, "saved": HASH, "parts": 1}
    {"text": WHOLE}
    {"at": 12, "out": 0, "put": "x"}
    ...

Changes go to the system one by one as they are made, so that a killed process loses none; once a second they are sent on
to the disk, so that a power cut loses no more than that. Some seconds after a change the file is written anew, in one piece.
"""

import hashlib
import json
import zlib
from collections.abc import Iterator
from dataclasses import dataclass

from composer.editor.deltas import Delta, Units

VERSION = 1
SYNC_MS = 1000
"""How often changes that were written are sent on to the disk."""

REWRITE_MS = 5000
"""How long after a change the whole text is kept anew, in one piece."""

PART = 1 << 18
"""Characters of the whole text in a line: so much is written at a time."""

MOST_BYTES = 256 << 20
"""A file of recovery is never read beyond this."""

ENDING = ".unsaved"


@dataclass(frozen=True, slots=True)
class Recovered:
    """An unsaved text: of which file ("" for one that never had any), the hash of what that file held, changes behind it."""

    of: str
    saved: str
    text: str
    changes: int


def name_beside(folder: str, name: str) -> str:
    """The path of the file of recovery of a score; `folder` with the separator that it needs, or empty."""
    return f"{folder}.{name}{ENDING}"


def hash_of(text: str) -> str:
    """What tells two texts apart."""
    return hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest()


def begin(of: str, saved: str, text: str) -> Iterator[bytes]:
    """The beginning of a file of recovery, line by line: what it is, and the whole text."""
    parts = [text[start : start + PART] for start in range(0, len(text), PART)] or [""]
    yield _line({"drawcord": "unsaved", "version": VERSION, "of": of, "saved": saved, "parts": len(parts)})
    for part in parts:
        yield _line({"text": part})


def change(delta: Delta) -> bytes:
    """One change, as it is added at the end."""
    return _line({"at": delta.at, "out": delta.out, "put": delta.put})


def read(data: bytes) -> Recovered | None:
    """What a file of recovery holds, up to the first line that is not whole; None where it is none or has no text."""
    lines = data.split(b"\n")
    head = _read_line(lines[0])
    if not head or head.get("drawcord") != "unsaved" or head.get("version") != VERSION:
        return None
    count = head.get("parts")
    parts = [_read_line(line) for line in lines[1 : 1 + count]] if isinstance(count, int) and count > 0 else []
    whole = [part["text"] for part in parts if part and isinstance(part.get("text"), str)]
    if not parts or len(whole) != count:
        return None
    units, changes = Units("".join(whole)), 0
    for line in lines[1 + count :]:
        made = _read_line(line)
        if made is None:
            break
        try:
            units.change(Delta(int(made["at"]), int(made["out"]), str(made["put"])))
        except (KeyError, TypeError, ValueError, OverflowError):
            break
        changes += 1
    return Recovered(str(head.get("of", "")), str(head.get("saved", "")), units.text, changes)


def _line(thing: dict) -> bytes:
    told = json.dumps(thing, ensure_ascii=True, separators=(",", ":")).encode()
    return b"%08x %s\n" % (zlib.crc32(told), told)


def _read_line(line: bytes) -> dict | None:
    if len(line) < 10 or line[8:9] != b" ":
        return None
    told = line[9:]
    try:
        if int(line[:8], 16) != zlib.crc32(told):
            return None
        made = json.loads(told)
    except (ValueError, RecursionError):
        return None
    return made if isinstance(made, dict) else None
