"""From a take to voices whose curves stay within the tolerance at every sample and ask for nothing that the rig cannot do."""

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.check import Check, check
from composer.limits.snag import Snag
from composer.limits.tables import rates
from composer.motion import strain_at
from composer.rig.model import Rig
from composer.score.tempo import TempoMap
from composer.tracks import Tracks
from player.takes.fewest import Path
from player.takes.fitting import Each, Fitting, one_by_one
from player.takes.played import Array, Index, Played
from player.takes.voices import Voice, leader_of, played_of, tracks_of, voices_of

MOST_POINTS = 5_000_000
"""Instants of the grid on which a take is laid out; a longer one is laid out more coarsely."""

ROUNDS = 12
"""How often what does not hold is fitted again, each time closer to what was played."""

WATCHED = 1
"""So many rounds it is enough to look at more instants; after that the slack falls too."""

CLOSER = 4
"""So many rounds a passage that is too fast is mended by rates alone."""

TIGHTER, LEAST = 0.8, 0.1
"""By how much the slack of such a passage falls, and to what share of the tolerance at least."""

SLOWER = 0.995
"""By how much the rates of a voice fall that is too fast somewhere, once looking at more instants is not enough."""

ENOUGH, STOOD = 1.5, 1e-6
"""Of the seconds that a coil is on for too long, how many are looked for; a share of stroke in a step that is no move."""

SPARE = 1.05
"""A hold lasts at least so much longer than a valve takes to switch, once one was too short."""

SPREAD = 1 << 20
"""Values of a take from which on other cores are of use: before that it takes as long to have them begin."""

FITTED = 0.7
"""Share of the work that is done once all is fitted for the first time, as a rule."""

STILL = 0.5
"""A share of the tolerance: a fiber that stays this near to where it began was not played."""


@dataclass(frozen=True, slots=True, eq=False)
class Settled:
    """A take as curves.

    voices, paths: what each voice plays; tracks: all fibers of the rig; checked: their check
    worst: (F,) share of stroke by which each is off what was played at worst; late: fibers that could not begin where they did
    """

    voices: list[Voice]
    paths: list[Path]
    tracks: Tracks
    checked: Check
    worst: Array
    late: Index

    @property
    def knots(self) -> int:
        """Moves and holds of all voices together."""
        return sum(path.moves for path in self.paths)


def settle(
    time_s: Array,
    governed: Callable[[int], Array],
    rig: Rig,
    abilities: Abilities,
    tempo: TempoMap,
    tolerance: float,
    start: Array | None = None,
    only: Index | None = None,
    *,
    every: bool = False,
    each: Each = one_by_one,
    tell: Callable[[float], None] = lambda share: None,
) -> Settled:
    """Fit what was played.

    time_s: (T,) instants of the samples; governed: strain (T,) of a fiber at them; tolerance: share of usable stroke
    start: (F,) strain that each fiber has as the take begins, at rest unless given; only: the fibers that were played
    every: those of `only` that stand still too; each: does something with each of some items, as `one_by_one` does
    tell: is told which share of the work is done, more or less
    """
    start = (np.zeros(len(rig.fibers)) if start is None else start) / abilities.stroke
    step = _step(time_s)
    grid = time_s[0] + step * np.arange(int(np.ceil((time_s[-1] - time_s[0]) / step - 1e-9)) + 1)
    fibers, shares, late = [], [], []
    for fiber in range(len(rig.fibers)) if only is None else only:
        share = np.clip(governed(int(fiber)) / abilities.stroke[fiber], 0.0, 1.0)
        if not every and np.abs(share - start[fiber]).max() <= STILL * tolerance:
            continue
        laid = np.interp(grid, time_s, share)
        if abs(share[0] - start[fiber]) > STILL * tolerance:
            laid = _caught_up(laid, start[fiber], int(fiber), step, abilities)
            late.append(int(fiber))
        fibers.append(int(fiber))
        shares.append(laid)
    index = np.array(fibers, dtype=np.int64)
    share = np.array(shares).reshape(len(fibers), len(grid))
    found = voices_of(share, start[index], abilities.which[index], tolerance)
    voices = [replace(voice, fibers=index[voice.fibers]) for voice in found]
    row = np.zeros(len(rig.fibers), dtype=np.int64)
    row[index] = np.arange(len(index))
    whole = _Rows(share, row)
    played = played_of(voices, whole[[leader_of(voice) for voice in voices]], start, abilities, float(grid[0]), step, tolerance)
    if share.size < SPREAD:
        each = one_by_one
    return _Settling(
        voices, played, whole, start, rig, abilities, tempo, tolerance, grid, np.array(late, dtype=np.int64), each
    ).run(tell)  # fmt: skip


class _Rows:
    """Shares of the fibers that were played, by their number in the rig."""

    def __init__(self, share: Array, row: Index):
        self.share, self.row = share, row

    def __getitem__(self, fibers: Index | list[int]) -> Array:
        return self.share[self.row[fibers]]

    def of(self, fiber: int) -> Array:
        """Those of one fiber, (M,); nobody writes into them."""
        return self.share[self.row[fiber]]


def _step(time_s: Array) -> float:
    if len(time_s) < 2:
        return 0.005
    usual = max(float(np.median(np.diff(time_s))), 0.001)
    return max(usual, float(time_s[-1] - time_s[0]) / MOST_POINTS)


def _caught_up(share: Array, start: float, fiber: int, step_s: float, abilities: Abilities) -> Array:
    """What was played, but begun from `start`: as fast as the fiber goes until it is where it was played."""
    stroke, now, caught = abilities.stroke[fiber], start, share.copy()
    for k in range(len(share)):
        rising = share[k] > now
        most = float(rates(abilities, np.array([fiber]), np.array([now * stroke]), np.array([rising]))[0]) / stroke * step_s
        if abs(share[k] - now) <= most and k:
            break
        now += 0.0 if k == 0 else (most if rising else -most) * 0.98
        caught[k] = now
    return caught


class _Settling:
    """Fitting again and again what does not hold yet."""

    def __init__(
        self, voices: list[Voice], played: Played, share: _Rows, start: Array, rig: Rig, abilities: Abilities, tempo: TempoMap,
        tolerance: float, grid_s: Array, late: Index, each: Each,
    ):  # fmt: skip
        self.voices, self.played, self.share, self.start = voices, played, share, start
        self.rig, self.abilities, self.tempo, self.tolerance = rig, abilities, tempo, tolerance
        self.grid_s, self.late, self.each = grid_s, late, each
        self.known: dict[int, tuple[Path, Array, NDArray[np.bool_]]] = {}
        self.voice_of = {int(f): number for number, voice in enumerate(voices) for f in voice.fibers}

    def run(self, tell: Callable[[float], None]) -> Settled:
        """The curves, once all is well or nothing more can be done."""
        fitting = Fitting(self.played, self.tempo, self.each)
        paths = fitting.fit(lambda share: tell(FITTED * share))
        best: tuple[tuple[int, int], Settled] | None = None
        for self.round in range(ROUNDS):
            tell(1.0 - (1.0 - FITTED) * 0.5**self.round)
            settled, off = self._seen(paths)
            wrong = (len(settled.checked.snags), int(np.count_nonzero(settled.worst > self.tolerance)))
            if best is None or wrong < best[0]:
                best = wrong, settled
            if wrong == (0, 0):
                break
            where = self._tightened(settled, off)
            if not where:
                break
            again = sorted(where)
            instants = [np.concatenate(where[number]) for number in again]
            fresh = fitting.again(self.played, again, [paths[number] for number in again], instants)
            paths = list(paths)
            for number, path in zip(again, fresh, strict=True):
                paths[number] = path
        tell(1.0)
        return best[1]

    def _seen(self, paths: list[Path]) -> tuple[Settled, dict[int, Array]]:
        """The curves with their faults: the check, and where each voice is off by too much, (M,) bool."""
        end_s = max([float(self.grid_s[-1]), *(float(path.time_s[-1]) for path in paths)])
        tracks = tracks_of(self.voices, paths, self.abilities, self.start, end_s)
        checked = check(tracks, self.rig, self.abilities)
        worst = np.zeros(tracks.fibers)
        off: dict[int, Array] = {}
        fresh = [number for number, path in enumerate(paths) if self.known.get(number, (None,))[0] is not path]
        fibers = [(number, k) for number in fresh for k in range(len(self.voices[number].fibers))]
        curves = [self._curve(int(self.voices[number].fibers[k]), tracks) for number, k in fibers]
        errors = self.each(_errors, curves, lambda done: None)
        for number in fresh:
            self.known[number] = (
                paths[number], np.zeros(len(self.voices[number].fibers)), np.zeros(len(self.grid_s), dtype=bool)
            )  # fmt: skip
        for (number, k), (most, far) in zip(fibers, errors, strict=True):
            self.known[number][1][k] = most
            self.known[number][2][:] |= far
        for number, voice in enumerate(self.voices):
            _, worst[voice.fibers], far = self.known[number]
            if far.any():
                off[number] = far
        return Settled(self.voices, paths, tracks, checked, worst, self.late), off

    def _curve(self, fiber: int, tracks: Tracks) -> "_Curve":
        """One fiber and nothing else."""
        mine = slice(tracks.first[fiber], tracks.first[fiber + 1])
        names = ("time_s", "curve", "manner", "shape", "line", "phrase_line")
        alone = Tracks(
            np.array([0, mine.stop - mine.start]), *(getattr(tracks, name)[mine] for name in names), tracks.duration_s
        )
        abilities = replace(self.abilities, which=self.abilities.which[[fiber]], stroke=self.abilities.stroke[[fiber]])
        return _Curve(alone, abilities, self.grid_s, self.share.of(fiber), self.tolerance)

    def _tightened(self, settled: Settled, off: dict[int, Array]) -> dict[int, list[Array]]:
        """Make the slack smaller, or the rates lower, where something does not hold; which voices, and instants."""
        slack, rest, watch = self.played.slack.copy(), self.played.rest_s.copy(), list(self.played.watch)
        ease = np.ones(len(slack))
        concerned: dict[int, list[Array]] = {}
        for number, far in off.items():
            watch[number] = np.union1d(watch[number], self.grid_s[far])
            if self.round > WATCHED:
                for span in self._moves_at(settled.paths[number], self.grid_s[far]):
                    slack[number, span] *= TIGHTER
            concerned.setdefault(number, []).append(self.grid_s[far])
        for snag in settled.checked.snags:
            numbers = range(len(self.voices)) if snag.fiber is None else [self.voice_of.get(snag.fiber)]
            for number in numbers:
                if number is None:
                    continue
                if snag.kind == "duty" and len(busy := self._busy(settled.paths[number], number, snag)):
                    # Only where the coil is on and was not as it was played is there anything to be had.
                    path = settled.paths[number]
                    for k in busy:
                        slack[number, self._span(path.time_s[k], path.time_s[k + 1])] *= TIGHTER**3
                    concerned.setdefault(number, []).append((path.time_s[busy] + path.time_s[busy + 1]) / 2.0)
                    continue
                instants = np.linspace(snag.from_s, snag.to_s, 9)
                concerned.setdefault(number, []).append(instants)
                if snag.kind in ("rate", "accel"):
                    watch[number] = np.union1d(watch[number], instants)
                    ease[number] = SLOWER if self.round > WATCHED else 1.0
                    # At last it is to stay so close to what was played that it goes no faster than that did.
                    by = 1.0 if self.round <= CLOSER else TIGHTER**3
                    for span in self._moves_between(settled.paths[number], snag):
                        slack[number, span] *= by
                elif snag.kind == "switching" and rest[number] == 0.0:
                    rest[number] = SPARE / snag.has
                else:
                    for span in self._moves_between(settled.paths[number], snag):
                        slack[number, span] *= TIGHTER
        self.played = replace(
            self.played, slack=np.maximum(slack, LEAST * self.tolerance), rest_s=rest, watch=tuple(watch),
            up=self.played.up * ease[:, None], down=self.played.down * ease[:, None], bend=self.played.bend * ease,
            even=bool(np.all(slack == slack[:, :1])),
        )  # fmt: skip
        return concerned

    def _busy(self, path: Path, number: int, snag: Snag) -> Index:
        """The moves of a path in which a fiber stood still longest as it was played, as many as a coil's duty asks for."""
        stood = np.concatenate([[0.0], np.cumsum(np.abs(np.diff(self.played.share[number])) < STOOD) * self.played.step_s])
        idle = np.diff(np.interp(path.time_s, self.grid_s, stood))
        idle[np.abs(np.diff(path.share)) < 1e-9] = 0.0
        idle[(path.time_s[1:] <= snag.from_s) | (path.time_s[:-1] >= snag.to_s)] = 0.0
        # Where a curve is as close as it can be, and the coil still on, others have to give.
        middle = np.searchsorted(self.grid_s, (path.time_s[1:] + path.time_s[:-1]) / 2.0)
        idle[self.played.slack[number, np.minimum(middle, len(self.grid_s) - 1)] <= LEAST * self.tolerance] = 0.0
        longest = np.argsort(-idle, kind="stable")
        enough = 1 + int(np.searchsorted(np.cumsum(idle[longest]), ENOUGH * (snag.needs - snag.has)))
        return np.sort(longest[:enough][idle[longest[:enough]] > 0.0])

    def _moves_at(self, path: Path, time_s: Array) -> list[slice]:
        """The stretches of the grid of the moves in which some instants lie."""
        moves = np.unique(np.clip(np.searchsorted(path.time_s, time_s, side="right") - 1, 0, path.moves - 1))
        return [self._span(path.time_s[k], path.time_s[k + 1]) for k in moves]

    def _moves_between(self, path: Path, snag: Snag) -> list[slice]:
        low = max(0, int(np.searchsorted(path.time_s, snag.from_s + 1e-9, side="right")) - 1)
        high = min(path.moves, int(np.searchsorted(path.time_s, snag.to_s - 1e-9, side="left")))
        return [self._span(path.time_s[low], path.time_s[max(high, low)])]

    def _span(self, from_s: float, to_s: float) -> slice:
        low = int(np.searchsorted(self.grid_s, from_s - self.played.step_s))
        return slice(low, int(np.searchsorted(self.grid_s, to_s + self.played.step_s)) + 1)


@dataclass(frozen=True, slots=True, eq=False)
class _Curve:
    """Tracks of one fiber, and what was played of it on a grid, share of stroke (M,)."""

    tracks: Tracks
    abilities: Abilities
    grid_s: Array
    share: Array
    tolerance: float


def _errors(curve: _Curve) -> tuple[float, NDArray[np.bool_]]:
    """By how much the fiber is off at worst, and where it is off by too much, (M,)."""
    error = strain_at(curve.tracks, curve.abilities, curve.grid_s)[0]
    error /= curve.abilities.stroke[0]
    error -= curve.share
    np.abs(error, out=error)
    return float(error.max()), error > curve.tolerance
