"""What the preview window has worked out beside it: snags, simulated run, retiming, each told as soon as it is known."""

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.faults import Faults
from composer.limits.check import check
from composer.load import load_rig, load_score
from composer.picture.bars import RetimedBars
from composer.picture.cloth.weave import stretches
from composer.picture.material import Piece, lanes_of
from composer.picture.recorded import recorded
from composer.picture.scene import Lane, Stretch
from composer.report.preview import sentences
from composer.report.tonight import Tonight, Watch
from composer.retime.programme import Unsolved
from composer.retime.whole_score import retime_score
from composer.simulate.hits import LandingLog
from composer.simulate.kept import Kept
from composer.simulate.run import DEFAULT_HZ, blocks, tail_s
from composer.tracks import Tracks
from composer.warp import along

Array = NDArray[np.float64]
Tell = Callable[[object], None]

TICKS = 400
"""Ticks between two words on how far the run is."""

FRAMES_HZ = 50.0
MOST_FRAMES = 1 << 25
MOST_COLUMNS = 8192
MOST_THREADS = 1 << 22
"""Values of strain kept for the hang view, and columns and values for the cloth, at most."""


@dataclass(frozen=True, slots=True)
class Snags:
    """What the check found, as the cloth shows it."""

    snags: tuple[Stretch, ...]


@dataclass(frozen=True, slots=True)
class Progress:
    """The share done, 0 to 1, of what."""

    what: str
    share: float


@dataclass(frozen=True, slots=True, eq=False)
class Ran:
    """The simulated run: strain (F, T) at `times_s` (T,), its tracks for a cloth, its lanes, its sentences, its margins."""

    times_s: Array
    strain: NDArray[np.float32]
    tracks: Tracks
    lanes: tuple[Lane, ...]
    told: tuple[str, ...]
    tonight: Tonight


@dataclass(frozen=True, slots=True, eq=False)
class Mended:
    """The piece retimed, and where instants have gone: `was_s`, `now_s` (W,)."""

    piece: Piece
    was_s: Array
    now_s: Array


@dataclass(frozen=True, slots=True)
class Failed:
    """What cannot be shown, as a sentence."""

    what: str
    why: str


def strain_at_head(ran: Ran, at_s: float) -> Array:
    """Strain (F,) of the simulated run at an instant, on the straight line between the samples beside it."""
    times = ran.times_s
    place = float(np.interp(at_s, times, np.arange(len(times))))
    low = min(int(place), len(times) - 2) if len(times) > 1 else 0
    high = min(low + 1, len(times) - 1)
    part = place - low
    return ran.strain[:, low] * (1.0 - part) + ran.strain[:, high] * part


def simulate(piece: Piece, tell: Tell) -> None:
    """Check a piece and play it on the simulated rig."""
    tell(Snags(stretches(check(piece.tracks, piece.rig, piece.abilities).snags)))
    fibers, length = max(piece.tracks.fibers, 1), max(piece.tracks.duration_s, 1e-3)
    frames = int(np.clip(length * FRAMES_HZ, 2, max(MOST_FRAMES // fibers, 2)))
    columns = int(min(MOST_COLUMNS, max(MOST_THREADS // fibers, 2), frames))
    shown = Kept(np.linspace(0.0, length, frames), piece.abilities.stroke)
    cloth = Kept(np.linspace(0.0, length, columns), piece.abilities.stroke)
    log = LandingLog(piece.tracks, piece.abilities.stroke)
    watch = Watch(piece.rig, piece.abilities)
    whole = length + tail_s(piece.abilities)
    for block in blocks(piece.tracks, piece.rig, piece.abilities, DEFAULT_HZ, values=TICKS * fibers):
        for each in (shown, cloth, log, watch):
            each.add(block)
        tell(Progress("simulating", min(1.0, float(block.time_s[-1]) / whole)))
    landings = log.landings()
    tonight = watch.tonight(landings, piece.tempo.say_place, piece.tracks)
    told = sentences(landings, piece.tracks, piece.abilities, piece.tempo.say_place, piece.names, tonight.lowest_kPa)
    seen = recorded(cloth.times_s, cloth.strain, piece.abilities.stroke, length)
    tell(Ran(shown.times_s, shown.strain, seen, lanes_of(piece.rig, cloth), tuple(told), tonight))


def mend(piece: Piece, path: str, rig_path: str | None, tell: Tell) -> None:
    """Retime the score of a piece with what the score itself says to keep."""
    try:
        loaded = load_score(path, None if rig_path is None else load_rig(rig_path))
    except Faults:
        tell(Failed("retiming", "the score was changed meanwhile and cannot be read now"))
        return
    try:
        found = retime_score(loaded, tell=lambda text: tell(Progress(text or "retiming", 0.0)))
    except Unsolved:
        tell(Failed("retiming", "the solver gave up; drawcord retime says more"))
        return
    if found.pins_short:
        tell(Failed("retiming", "pins are too close together; drawcord retime says which"))
        return
    was, now = found.warp_was_s, found.warp_now_s
    cues = tuple(replace(cue, at_s=float(along(cue.at_s, was, now))) for cue in piece.cues)
    tell(Mended(
        replace(
            piece, rig=loaded.rig, abilities=loaded.abilities, tracks=found.tracks, tempo=RetimedBars(loaded.tempo, was, now),
            cues=cues, retimed=True,
        ), was, now,
    ))  # fmt: skip
