"""Voices: fibers that moved alike, each voice with one curve that its fibers follow at their own scales."""

from dataclasses import dataclass

import numpy as np

from composer.limits.abilities import Abilities
from composer.limits.tables import rates, travel_time_s
from composer.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, SAME_INSTANT_S, SUDDEN, Tracks
from player.takes.fewest import Path
from player.takes.played import RATES, Array, Clock, Index, Played

ALIKE = 0.3
"""A share of the tolerance: fibers that differ by no more than this play one phrase."""


@dataclass(frozen=True, slots=True, eq=False)
class Voice:
    """Fibers (indices in the rig, rising) and how much of the voice's curve each goes; differs: how much they differ."""

    fibers: Index
    scales: Array
    differs: float


def voices_of(share: Array, start: Array, which: Index, tolerance: float) -> list[Voice]:
    """The voices among some fibers, in the order of their first fibers; its curve is that of the fiber that goes furthest.

    share: (F, M) of usable stroke; start: (F,) where each begins; which: (F,) number of its capability
    """
    few = share[:, :: max(1, share.shape[1] // 2000)]
    reach = share.max(axis=1, initial=0.0)
    leaders: list[int] = []
    members: list[list[tuple[int, float, float]]] = []
    energy = np.einsum("fm,fm->f", few, few)
    for fiber in np.lexsort((np.arange(len(share)), -reach)):
        if leaders:
            scale = few[leaders] @ few[fiber] / np.maximum(energy[leaders], 1e-12)
        for number, leader in enumerate(leaders):
            off = _alike(share, few, start, int(fiber), leader, float(scale[number]), tolerance)
            # Another make goes another way when it goes as fast as it can.
            if off is not None and which[fiber] == which[leader]:
                members[number].append((int(fiber), *off))
                break
        else:
            leaders.append(int(fiber))
            members.append([(int(fiber), 1.0, 0.0)])
    voices = []
    for mine in members:
        mine.sort()
        fibers, scales, off = zip(*mine, strict=True)
        voices.append(Voice(np.array(fibers), np.array(scales), max(off)))
    return sorted(voices, key=lambda voice: int(voice.fibers[0]))


def _alike(
    share: Array, few: Array, start: Array, fiber: int, leader: int, scale: float, tolerance: float
) -> tuple[float, float] | None:
    """The scale by which one fiber follows another, and its greatest difference, None where it does not."""
    for rounded in dict.fromkeys((1.0, round(scale, 1), round(scale, 2))):
        if rounded <= 0.0 or abs(rounded - scale) > tolerance or abs(start[fiber] - rounded * start[leader]) > 1e-9:
            continue
        if np.abs(few[fiber] - rounded * few[leader]).max() <= ALIKE * tolerance:
            off = float(np.abs(share[fiber] - rounded * share[leader]).max())
            if off <= ALIKE * tolerance:
                return rounded, off
    return None


def leader_of(voice: Voice) -> int:
    """Which of a voice's fibers has its curve."""
    return int(voice.fibers[np.argmin(np.abs(voice.scales - 1.0))])


def played_of(
    voices: list[Voice], share: Array, start: Array, abilities: Abilities, begin_s: float, step_s: float,
    tolerance: float,
) -> Played:  # fmt: skip
    """What the voices played, with what they may miss and how fast they may go.

    share, start: of stroke, (V, M) of the voices' leaders and (F,) of all fibers of the rig
    """
    leaders = [leader_of(voice) for voice in voices]
    curves = share
    grid = np.linspace(0.0, 1.0, RATES)
    up, down = np.full((len(voices), RATES), np.inf), np.full((len(voices), RATES), np.inf)
    bend, slack, clocks = np.empty(len(voices)), np.empty(len(voices)), []
    for row, voice in enumerate(voices):
        kinds = {(abilities.which[f], s): int(f) for f, s in zip(voice.fibers, voice.scales, strict=True)}
        for (_, scale), fiber in kinds.items():
            unit = scale * abilities.stroke[fiber]
            strain = grid * unit
            each = np.full(strain.shape, fiber)
            up[row] = np.minimum(up[row], rates(abilities, each, strain, np.ones(strain.shape, bool)) / unit)
            down[row] = np.minimum(down[row], rates(abilities, each, strain, np.zeros(strain.shape, bool)) / unit)
        bend[row] = np.min(abilities.accel[voice.fibers] / (voice.scales * abilities.stroke[voice.fibers]))
        slack[row] = (tolerance - voice.differs) / max(1.0, voice.scales.max())
        clocks.append(_clock(abilities, int(voice.fibers[0])) if len(kinds) == 1 and voice.scales[0] == 1.0 else None)
    return Played(
        begin_s, step_s, curves, np.repeat(slack[:, None], curves.shape[1], axis=1), up, down, bend, start[leaders],
        tuple(clocks), np.zeros(len(voices)), (np.empty(0),) * len(voices), True,
    )  # fmt: skip


def _clock(abilities: Abilities, fiber: int) -> Clock:
    share = np.linspace(0.0, 1.0, RATES)
    strain, rest = share * abilities.stroke[fiber], np.zeros(RATES)
    each = np.full(RATES, fiber)
    return Clock(share, travel_time_s(abilities, each, rest, strain), travel_time_s(abilities, each, strain, rest))


def tracks_of(voices: list[Voice], paths: list[Path], abilities: Abilities, start: Array, end_s: float) -> Tracks:
    """The tracks of all fibers of the rig; those of no voice stay where they start, (F,) share of stroke."""
    fibers = len(abilities.stroke)
    by_fiber: list[tuple[Array, Array, Array, Array]] = [
        (np.zeros(1), _still(start[f : f + 1] * abilities.stroke[f]), np.zeros(1), np.full(1, -1)) for f in range(fibers)
    ]
    for voice, path in zip(voices, paths, strict=True):
        for fiber, scale in zip(voice.fibers, voice.scales, strict=True):
            by_fiber[fiber] = _track(path, int(fiber), scale * abilities.stroke[fiber], abilities)
    columns = [np.concatenate(part) for part in zip(*by_fiber, strict=True)]
    first = np.concatenate([[0], np.cumsum([len(track[0]) for track in by_fiber])])
    none = np.zeros(len(columns[0]), dtype=np.int32)
    return Tracks(
        first, columns[0], columns[1], columns[2].astype(np.int8), columns[3].astype(np.int8), none, none,
        max(end_s, float(columns[0].max())),
    )  # fmt: skip


def _still(strain: Array) -> Array:
    curve = np.zeros((len(strain), 6))
    curve[:, 0] = strain
    return curve


def _track(path: Path, fiber: int, unit: float, abilities: Abilities) -> tuple[Array, Array, Array, Array]:
    """One fiber's knots: time, curve, manner, shape."""
    time, strain, shape = path.time_s, path.share * unit, path.shape.astype(np.int64)
    way = np.diff(strain)
    still = np.abs(way) < 1e-12
    powers = np.array([PROGRESS.get(name, np.zeros(6)) for name in NAMES])
    curve = powers[shape] * way[:, None]
    curve[:, 0] = strain[:-1]
    curve[still, 1:] = 0.0
    sudden = (shape == NAMES.index("sudden")) & ~still
    manner = np.where(still, HOLD, np.where(sudden, SUDDEN, MOVE))
    shape = np.where(still, -1, shape)
    begins = time[:-1].copy()
    at = np.flatnonzero(sudden)
    takes = travel_time_s(abilities, np.full(len(at), fiber), strain[at], strain[at + 1])
    sets_out = np.maximum(time[at + 1] - takes, begins[at])
    begins[at] = sets_out
    waits = at[sets_out > time[at] + SAME_INSTANT_S]
    begins = np.insert(begins, waits, time[waits])
    curve = np.insert(curve, waits, _still(strain[waits]), axis=0)
    manner, shape = np.insert(manner, waits, HOLD), np.insert(shape, waits, -1)
    # Before the first knot and after the last a fiber is still.
    lead = [0.0] if time[0] > SAME_INSTANT_S else []
    begins = np.concatenate([lead, begins, time[-1:]])
    curve = np.concatenate([_still(strain[: len(lead)]), curve, _still(strain[-1:])])
    manner = np.concatenate([np.full(len(lead), HOLD), manner, [HOLD]])
    shape = np.concatenate([np.full(len(lead), -1), shape, [-1]])
    kept = np.append(True, (manner[1:] != HOLD) | (manner[:-1] != HOLD))
    return begins[kept], curve[kept], manner[kept], shape[kept]
