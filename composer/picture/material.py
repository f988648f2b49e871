"""A whole preview as data: the run on the simulated rig, what it told, and the scene of its picture."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.check import check
from composer.picture.bands import bands_of
from composer.picture.bars import Bars
from composer.picture.image import column_times, extends
from composer.picture.scene import CueMark, Lane, Scene, Stretch
from composer.rig.model import Rig
from composer.simulate.hits import LandingLog, Landings
from composer.simulate.kept import Kept
from composer.simulate.run import DEFAULT_HZ, Block, blocks, tail_s
from composer.tracks import Tracks

Array = NDArray[np.float64]

MOST_KEPT = 1 << 25
"""Values of strain kept for a picture at most, 4 bytes each."""


@dataclass(frozen=True, slots=True, eq=False)
class Piece:
    """What is previewed: tracks on a rig, with its bars, pins (s) and cues. retimed: whether times were changed."""

    title: str
    rig: Rig
    abilities: Abilities
    tracks: Tracks
    tempo: Bars
    pins_s: tuple[float, ...]
    cues: tuple[CueMark, ...]
    retimed: bool = False

    @property
    def names(self) -> tuple[str, ...]:
        """The fibers' names, in the rig's order."""
        return tuple(fiber.name for fiber in self.rig.fibers)


@dataclass(frozen=True, slots=True, eq=False)
class Seen:
    """What a run showed: how fibers landed, the lowest pressure of the receiver in kPa, air drawn in L, columns to draw."""

    landings: Landings
    lowest_kPa: float
    used_L: float
    kept: Kept


def run(
    piece: Piece,
    columns: int,
    rate_Hz: float = DEFAULT_HZ,
    inverse: bool = True,
    each: Callable[[Block], None] = lambda block: None,
    progress: Callable[[float], None] = lambda share: None,
) -> Seen:
    """Play a piece on the simulated rig, keeping `columns` of it to be drawn.

    each: called with every block of ticks; progress: called with the share done, 0 to 1
    """
    length = max(piece.tracks.duration_s, 1e-3)
    columns = int(max(2, min(columns, MOST_KEPT // max(1, piece.tracks.fibers))))
    kept = Kept(column_times(0.0, length, columns), piece.abilities.stroke)
    log = LandingLog(piece.tracks, piece.abilities.stroke)
    whole = length + tail_s(piece.abilities)
    lowest, used = piece.rig.supply.max_receiver_kPa, 0.0
    for block in blocks(piece.tracks, piece.rig, piece.abilities, rate_Hz, inverse):
        kept.add(block)
        log.add(block)
        each(block)
        used = block.drawn_L
        lowest = min(lowest, float(block.supply_kPa.min()))
        progress(min(1.0, float(block.time_s[-1]) / whole))
    return Seen(log.landings(), lowest, used, kept)


def scene_of(piece: Piece, seen: Seen) -> Scene:
    """The whole piece as a scene, with the snags that the checker finds."""
    stretches = tuple(
        Stretch(snag.fiber, snag.from_s, snag.to_s) for snag in check(piece.tracks, piece.rig, piece.abilities).snags
    )
    count = piece.tracks.fibers
    told = [
        f"{'retimed' if piece.retimed else 'as written'}, on the simulated rig",
        f"{count} fiber{'s' * (count != 1)}",
        _minutes(piece.tracks.duration_s),
    ]
    return Scene(
        title=piece.title,
        subtitle="  ·  ".join(told),
        from_s=0.0,
        to_s=max(piece.tracks.duration_s, 1e-3),
        share=seen.kept.strain / piece.abilities.stroke[:, None].astype(np.float32),
        extending=extends(piece.abilities),
        bands=bands_of(piece.rig),
        names=piece.names,
        tempo=piece.tempo,
        snags=stretches,
        pins_s=piece.pins_s,
        cues=piece.cues,
        lanes=lanes_of(piece.rig, seen.kept),
    )


def lanes_of(rig: Rig, kept: Kept) -> tuple[Lane, ...]:
    """The receiver's pressure, the highest use of a coil's allowance, and the largest miss."""
    least, most = rig.supply.min_pressure_kPa, rig.supply.max_receiver_kPa
    lowest = min(float(np.nanmin(kept.supply_kPa, initial=most)), least)
    duty = 100.0 * kept.duty
    miss = 100.0 * kept.miss
    return (
        Lane(
            "receiver",
            "kPa gauge",
            kept.supply_kPa,
            max(0.0, lowest - 0.1 * (most - lowest)),
            most + 0.06 * (most - lowest) + 1.0,
            "supply",
            least,
            "minimum",
            True,
        ),
        Lane(
            "top duty",
            "% in use",
            duty,
            0.0,
            max(112.0, 1.08 * float(np.nanmax(duty, initial=0.0))),
            "duty",
            100.0,
            "all used",
        ),
        Lane("largest miss", "% of stroke", miss, 0.0, max(20.0, 1.08 * float(np.nanmax(miss, initial=0.0))), "miss"),
    )


def _minutes(seconds: float) -> str:
    minutes, rest = divmod(round(seconds), 60)
    return f"{minutes}:{rest:02d} min"
