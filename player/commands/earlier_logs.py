"""Logs of earlier runs of a rig that lie in a folder, and what grows from run to run.

The record of a rig's runs is its logs: those in the folder of the newest one, of the same fingerprint. Of each only its
beginning and its end are read.
"""

import os
from typing import Any

import numpy as np
from numpy.typing import NDArray

from player.commands.played import Played
from player.engine.clock import stamp
from player.engine.framed import frames
from player.engine.run_log import KINDS, MAGIC, walk
from player.engine.standing import MOST_RUNS, WHERE, drifting
from player.engine.trim import LEVELS, MOST

Array = NDArray[np.float64]

MOST_FILES = 400
"""Files of a folder that are looked into, the newest of them."""
HEAD_BYTES, TAIL_BYTES = 1 << 20, 1 << 21
_END_FRAME = 13
"""Bytes of a record before its body."""


def drift(log: str, fingerprint: str, date: str, stood: dict[str, Any], fibers: list[str]) -> dict[str, Any]:
    """How a run's fibers stand beside those of the runs before it.

    Args:
        log: path of the run's log, in whose folder the others lie
        fingerprint, date: of the rig and the run, as in the log's head
        stood: as in the log's end: "at_rest" and "held", for each fiber a share of stroke or None
        fibers: their names

    Returns:
        logs: names of the earlier ones, oldest first; fibers: which stand further off from run to run, worst first.
    """
    now = _means(stood, len(fibers))
    earlier = [] if now is None else _earlier(log, fingerprint, date, len(fibers))
    grown = drifting([means for _, _, means in earlier] + [now]) if now is not None else []
    return {
        "logs": [name for _, name, _ in earlier],
        "fibers": [
            {
                "fiber": fibers[one.fiber],
                "where": one.where,
                "now": round(one.now, 5),
                "a_run": round(one.a_run, 5),
                "runs": one.runs,
            }
            for one in grown
        ],
    }


def beside_earlier(log: str | None, played: Played, told: dict[str, Any]) -> dict[str, Any]:
    """What the report of a run that has just ended says of it, where its log is kept among others; else nothing."""
    if log is None:
        return {}
    fingerprint = f"{played.rig.fingerprint:08x}"
    return {"drift": drift(log, fingerprint, stamp(), told["stood"], list(played.names))}


def _earlier(log: str, fingerprint: str, date: str, fibers: int) -> list[tuple[str, str, Array]]:
    """Date, name and means (F, 2) of the runs of a rig before that date, oldest first."""
    own = os.path.realpath(log)
    found = []
    for path in _newest(log):
        if os.path.realpath(path) == own:
            continue
        told = _told(path)
        if told is None or told[0].get("fingerprint") != fingerprint or not str(told[0].get("date", "")) < date:
            continue
        means = _means(told[1].get("stood"), fibers)
        if means is not None:
            found.append((str(told[0]["date"]), os.path.basename(path), means))
    return sorted(found, key=lambda one: one[:2])[-(MOST_RUNS - 1) :]


def learned(log: str | None, fingerprint: str, fibers: int) -> tuple[str, Array] | None:
    """The newest log of a rig in that log's folder, the one about to be written over too, at whose end stands what the trim
    had learned: its name, and corrections (fibers, levels). None where there is none."""
    for path in _newest(log) if log is not None else ():
        told = _told(path)
        if told is not None and told[0].get("fingerprint") == fingerprint:
            by = _corrections(told[1].get("trim"), fibers)
            if by is not None:
                return os.path.basename(path), by
    return None


def _corrections(rows: Any, fibers: int) -> Array | None:
    """Corrections (fibers, levels) from what a log's end says; None where it says nothing that makes sense."""
    if not isinstance(rows, list) or len(rows) != fibers:
        return None
    if not all(isinstance(row, list) and len(row) == len(LEVELS) for row in rows):
        return None
    if not all(type(one) in (int, float) and abs(one) <= MOST for row in rows for one in row):
        return None
    return np.array(rows, dtype=float)


def _newest(log: str) -> list[str]:
    """Paths of the files in a log's folder, the newest first."""
    try:
        with os.scandir(os.path.dirname(os.path.abspath(log))) as entries:
            files = [(entry.stat().st_mtime, entry.path) for entry in entries if entry.is_file()]
    except OSError:
        return []
    return [path for _, path in sorted(files, reverse=True)[:MOST_FILES]]


def _told(path: str) -> tuple[dict[str, Any], dict[str, Any]] | None:
    """Head and end of a log; None where the file is none, or has been cut off."""
    try:
        with open(path, "rb") as file:
            if file.read(len(MAGIC)) != MAGIC:
                return None
            file.seek(0)
            head = next((record for record, _ in walk(file.read(HEAD_BYTES))), None)
            size = file.seek(0, os.SEEK_END)
            file.seek(max(0, size - TAIL_BYTES))
            tail = file.read(TAIL_BYTES)
    except (OSError, ValueError):
        return None
    at = tail.rfind(b'{"ended":') - _END_FRAME
    if head is None or head.kind != "head" or at < 0:
        return None
    last = next(frames(tail, at, KINDS), None)
    if last is None or KINDS[last[0]] != "end" or last[3] != len(tail):
        return None
    # As a log of nothing but its end, so that there is one reader.
    ends = [record for record, _ in walk(MAGIC + tail[at:])]
    return (head.told, ends[0].told) if ends else None


def _means(stood: Any, fibers: int) -> Array | None:
    """Means (F, 2) from what a log's end says; None where it says nothing that makes sense."""
    if not isinstance(stood, dict):
        return None
    columns = [stood.get(where.replace(" ", "_")) for where in WHERE]
    if not all(isinstance(column, list) and len(column) == fibers for column in columns):
        return None
    if not all(one is None or (type(one) in (int, float) and abs(one) <= 10.0) for column in columns for one in column):
        return None
    return np.array([[np.nan if one is None else one for one in column] for column in columns], dtype=float).T


def sentences(drift: dict[str, Any]) -> list[str]:
    """What a person is told of it; nothing where there are too few runs to say."""
    from player.engine.alarms import ALARMS

    row = ALARMS["runs"]
    return [
        f"{one['fiber']} {row.says}: {100 * one['now']:+.1f} % of stroke {one['where']}, {100 * one['a_run']:+.1f} % a run over"
        f" {one['runs']} runs; {row.hint}."
        for one in drift["fibers"]
    ]
