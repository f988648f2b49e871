"""The log of a run as a file: begun before anything moves, whole up to whatever ends it."""

import os
from collections.abc import Iterator
from contextlib import ExitStack
from typing import Any

import numpy as np

from composer.faults import fault
from composer.tracks import HOLD, Tracks, fiber_of
from player.commands.played import Played
from player.engine.clock import stamp
from player.engine.loop import Engine
from player.engine.run_log import RunLog

HITS_A_RECORD = 200
SAME_HIT_S = 1e-4
"""Moves that land closer together than this land together."""


def open_log(path: str, stack: ExitStack, engine: Engine, played: Played, targets: tuple[str, ...], now_s: float) -> RunLog:
    """The run's log, begun and given to the engine; every record is in the system's hands as soon as it is written.

    Raises Faults where the file cannot be written.
    """
    try:
        # Unbuffered, so that a run killed at any moment leaves all that was logged up to there.
        file = open(path, "wb", buffering=0)  # noqa: SIM115
    except (OSError, ValueError) as error:
        why = getattr(error, "strerror", None) or error
        raise fault(path, f"the log cannot be written: {why}", hint="choose another place with --log FILE") from None
    stack.callback(file.close)

    def write(data: bytes) -> None:
        view = memoryview(data)
        while view:
            view = view[file.write(view) :]

    log = RunLog(write)
    log.tell("head", now_s, **_head(played, engine, targets), date=stamp())
    for hits in _hits(played):
        log.tell("hits", now_s, hits=hits)
    if log.broken:
        raise fault(path, f"the log cannot be written: {log.broken}", hint="choose another place with --log FILE")
    engine.keep_log(log, played.say_place)
    return log


def _head(played: Played, engine: Engine, targets: tuple[str, ...]) -> dict[str, Any]:
    return {
        "played": os.path.basename(played.path),
        "kind": played.kind,
        "title": played.title,
        "rig": os.path.basename(played.rig.file),
        "fingerprint": f"{played.rig.fingerprint:08x}",
        "targets": list(targets),
        "rate_Hz": engine.rate_Hz,
        "ahead_s": round(engine.ahead_s, 6),
        "lead_s": round(engine.source.lead_s, 6),
        "duration_s": round(engine.source.duration_s, 6),
        "least_supply_kPa": played.rig.supply.min_pressure_kPa,
        "drivers": [driver.name for driver in played.rig.drivers],
        "fibers": list(played.names),
        "stroke": [round(float(stroke), 6) for stroke in played.abilities.stroke],
        "extends": [played.abilities.capabilities[one].direction == "extend" for one in played.abilities.which],
        "drives": [fiber.mounting.valve.drive for fiber in played.rig.fibers],
    }


def _hits(played: Played) -> Iterator[list[tuple[int, str, list[int]]]]:
    """Where moves land: instant in µs, place, fibers; in pieces of HITS_A_RECORD."""
    if played.tracks is None:
        return
    at_s, fiber = landings(played.tracks)
    order = np.argsort(at_s, kind="stable")
    at_s, fiber = at_s[order], fiber[order]
    starts = np.flatnonzero(np.diff(at_s, prepend=-np.inf) > SAME_HIT_S)
    piece = []
    for start, end in zip(starts, [*starts[1:], len(at_s)], strict=True):
        at = float(at_s[start])
        piece.append((round(at * 1e6), played.say_place(at), sorted({int(one) for one in fiber[start:end]})))
        if len(piece) == HITS_A_RECORD:
            yield piece
            piece = []
    if piece:
        yield piece


def landings(tracks: Tracks) -> tuple[np.ndarray, np.ndarray]:
    """Instants in s (H,) at which a move ends, and whose it is (H,)."""
    segment = np.flatnonzero(tracks.manner[:-1] != HOLD)
    owner = fiber_of(tracks)
    segment = segment[owner[segment] == owner[segment + 1]]
    return tracks.time_s[segment + 1], owner[segment]
