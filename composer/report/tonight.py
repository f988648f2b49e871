"""What fibers will do tonight: the whole score on the simulated rig before a run, with the lowest margins named."""

from collections.abc import Callable
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.coil import coils_of
from composer.rig.model import Rig
from composer.simulate.duty import STILL
from composer.simulate.hits import LandingLog, Landings
from composer.simulate.run import Block, blocks, tail_s
from composer.tracks import Tracks

Array = NDArray[np.float64]

CLOSEST = 3
"""Landings that are named, of as many lines of the score."""

CLOSE = 0.005
"""Share of the stroke from which on a landing is worth naming."""

MOST_GROUPS = 4
"""Groups that sentences name, those worked hardest first."""


@dataclass(frozen=True, slots=True)
class GroupLoad:
    """The coil of a group that is worked hardest: share of its duty's allowance used at most, where, and at the end.

    heat: greatest warmth of a coil, 1 the warmth that its duty may hold for ever; nan where the rig's keys say nothing of it
    """

    group: str
    duty: float
    fiber: str
    at_s: float
    place: str
    end_duty: float
    heat: float
    heat_fiber: str


@dataclass(frozen=True, slots=True)
class CloseHit:
    """A landing that misses, the worst of its line: when, error as a share of stroke, seconds late (nan: never there)."""

    fiber: str
    at_s: float
    place: str
    line: int
    error_of_stroke: float
    late_s: float


@dataclass(frozen=True, slots=True)
class Tonight:
    """A whole run foretold: kPa gauge in the receiver, L of free air, margins by group, closest landings."""

    duration_s: float
    lowest_kPa: float
    lowest_at_s: float
    lowest_place: str
    needed_kPa: float
    end_kPa: float
    used_L: float
    groups: tuple[GroupLoad, ...]
    landings: int
    missed: int
    closest: tuple[CloseHit, ...]


def warming_s(duty: Array, burst_s: Array) -> Array:
    """Time constant in s (F,) of a coil's warmth, one body that warms and cools (first order); nan where keys give none.

    A rig file says no more than a duty and a burst. A coil that is on from cold may stay so for burst / (1 - duty), the end of
    its allowance; the constant is the one with which it then has the warmth of its duty for ever: 1 - exp(-t / tau) = duty.
    """
    duty, burst = np.asarray(duty, dtype=float), np.asarray(burst_s, dtype=float)
    with np.errstate(divide="ignore", invalid="ignore"):
        tau = burst / (1.0 - duty) / -np.log1p(-duty)
    return np.where((duty < 1.0) & (burst > 0.0), tau, np.nan)


class Watch:
    """Watches a run: `add` every block in order, then `tonight`."""

    def __init__(self, rig: Rig, abilities: Abilities):
        fibers = len(rig.fibers)
        self._rig, self._coils = rig, coils_of(rig)
        self._stroke = abilities.stroke
        self._tau = warming_s(self._coils.duty, self._coils.burst_s)
        self._was: Array | None = None
        self._time = 0.0
        self._beyond, self._warm = np.zeros(fibers), np.zeros(fibers)
        self._most, self._most_at = np.zeros(fibers), np.zeros(fibers)
        self._warmest = np.zeros(fibers)
        self._lowest = (rig.supply.max_receiver_kPa, 0.0)
        self._end_kPa, self._used = rig.supply.max_receiver_kPa, 0.0

    def add(self, block: Block) -> None:
        """Take in the next ticks."""
        low = int(np.argmin(block.supply_kPa))
        if block.supply_kPa[low] < self._lowest[0]:
            self._lowest = (float(block.supply_kPa[low]), float(block.time_s[low]))
        self._end_kPa, self._used = float(block.supply_kPa[-1]), block.drawn_L
        strain = block.strain if self._was is None else np.column_stack([self._was, block.strain])
        time = block.time_s if self._was is None else np.append(self._time, block.time_s)
        self._was, self._time = block.strain[:, -1], float(block.time_s[-1])
        if len(time) < 2 or not len(strain):
            return
        step = float(time[-1] - time[0]) / (len(time) - 1)
        holding = self._coils.holding[:, None] & (strain[:, 1:] > STILL)
        on = (np.abs(np.diff(strain, axis=1)) > STILL) | holding
        self._count_duty(on, step, time[1:])
        self._count_warmth(on, step)

    def _count_duty(self, on: NDArray[np.bool_], step: float, time: Array) -> None:
        """On-time beyond the duty: the backlog of a leaky bucket (Cruz 1991), by Lindley's recursion in closed form."""
        sums = np.cumsum((on - self._coils.duty[:, None]) * step, axis=1)
        beyond = sums - np.minimum(np.minimum.accumulate(sums, axis=1), -self._beyond[:, None])
        self._beyond = beyond[:, -1]
        allowed = self._coils.burst_s[:, None]
        share = np.divide(beyond, allowed, out=(beyond > STILL).astype(float), where=allowed > 0.0)
        at = np.argmax(share, axis=1)
        most = share[np.arange(len(share)), at]
        more = most > self._most
        self._most = np.where(more, most, self._most)
        self._most_at = np.where(more, time[at], self._most_at)

    def _count_warmth(self, on: NDArray[np.bool_], step: float) -> None:
        """Each tick a coil comes nearer, by a share that its time constant says, to the warmth of being on, or to none."""
        for tau in np.unique(self._tau[np.isfinite(self._tau)]):
            which = np.flatnonzero(self._tau == tau)
            # The sum below is of rising powers, which stay far from what a float holds in stretches of so many ticks.
            ticks = max(1, int(20.0 * tau / step))
            heat = (1.0 - np.exp(-step / tau)) / self._coils.duty[which, None]
            for begin in range(0, on.shape[1], ticks):
                part = on[which, begin : begin + ticks]
                rising = np.exp(step / tau * np.arange(1, part.shape[1] + 1))
                warm = (self._warm[which, None] + np.cumsum(part * heat * rising, axis=1)) / rising
                self._warm[which] = warm[:, -1]
                self._warmest[which] = np.maximum(self._warmest[which], warm.max(axis=1))

    def tonight(self, found: Landings, say_place: Callable[[float], str], tracks: Tracks) -> Tonight:
        """All that was seen. say_place: bar and count of an instant in s"""
        supply = self._rig.supply
        names = [fiber.name for fiber in self._rig.fibers]
        share = np.abs(found.error) / self._stroke[found.fiber] if len(found.fiber) else np.zeros(0)
        missed = (share >= CLOSE) | np.isnan(found.late_s)
        # One that never arrives comes before any that is late.
        order = np.lexsort((-np.nan_to_num(share), -np.where(np.isnan(found.late_s), np.inf, found.late_s)))
        lines: dict[int, int] = {}
        for n in order.tolist():
            if missed[n]:
                lines.setdefault(int(tracks.line[found.segment[n]]), n)
        closest = tuple(
            CloseHit(
                names[found.fiber[n]],
                float(found.time_s[n]),
                say_place(float(found.time_s[n])),
                line,
                float(share[n]),
                float(found.late_s[n]),
            )
            for line, n in list(lines.items())[:CLOSEST]
        )
        return Tonight(
            duration_s=tracks.duration_s,
            lowest_kPa=self._lowest[0],
            lowest_at_s=self._lowest[1],
            lowest_place=say_place(self._lowest[1]),
            needed_kPa=min(supply.pressure_kPa, supply.min_pressure_kPa),
            end_kPa=self._end_kPa,
            used_L=self._used,
            groups=tuple(self._load(name, members, names, say_place) for name, members in self._groups() if len(members)),
            landings=len(share),
            missed=int(np.count_nonzero(missed)),
            closest=closest,
        )

    def _groups(self) -> list[tuple[str, NDArray[np.int64]]]:
        """The rig's groups, then what lies in none of them, then, where there are no groups, all."""
        groups = [(name, np.array(members, dtype=np.int64)) for name, members in self._rig.groups.items()]
        inside = {member for _, members in groups for member in members.tolist()}
        rest = np.array([n for n in range(len(self._rig.fibers)) if n not in inside], dtype=np.int64)
        return [*groups, ("the others" if groups else "all", rest)]

    def _load(self, group: str, members: NDArray[np.int64], names: list[str], say_place: Callable[[float], str]) -> GroupLoad:
        hardest = int(members[np.argmax(self._most[members])])
        warmth = np.where(np.isfinite(self._tau[members]), self._warmest[members], -1.0)
        warmest = int(members[np.argmax(warmth)])
        allowed = self._coils.burst_s[members]
        end = np.divide(self._beyond[members], allowed, out=np.zeros(len(members)), where=allowed > 0.0)
        return GroupLoad(
            group,
            float(self._most[hardest]),
            names[hardest],
            float(self._most_at[hardest]),
            say_place(float(self._most_at[hardest])),
            float(end.max()),
            float(self._warmest[warmest]) if warmth.max() >= 0.0 else float("nan"),
            names[warmest],
        )


def foretold(tracks: Tracks, rig: Rig, abilities: Abilities, say_place: Callable[[float], str],
             progress: Callable[[float], None] = lambda share: None) -> Tonight:  # fmt: skip
    """Play a whole score on the simulated rig and say what will come. progress: called with the share done, 0 to 1"""
    watch, log = Watch(rig, abilities), LandingLog(tracks, abilities.stroke)
    whole = max(tracks.duration_s + tail_s(abilities), 1e-3)
    for block in blocks(tracks, rig, abilities):
        watch.add(block)
        log.add(block)
        progress(min(1.0, float(block.time_s[-1]) / whole))
    return watch.tonight(log.landings(), say_place, tracks)


def sentences(found: Tonight) -> list[str]:
    """What an operator should know before the run: supply, coils, landings, a sentence each."""
    told = [_supply(found)]
    if found.groups:
        hardest = sorted(found.groups, key=lambda group: -group.duty)[:MOST_GROUPS]
        worst = hardest[0]
        if worst.duty <= 0.0:
            told.append("No valve uses any of its burst: every coil stays within its duty all the time.")
        else:
            each = "; ".join(
                f"{group.group} {_percent(group.duty)} ({group.fiber}, bar {_bar_count(group.place)})"
                for group in hardest
                if group.duty > 0.0
            )
            over = ", which is more than the valve bears" if worst.duty > 1.0 else ""
            told.append(f"Most of the burst beyond its duty that a valve uses, by group: {each}{over}.")
        warm = [group for group in found.groups if group.heat == group.heat]
        if warm:
            hot = max(warm, key=lambda group: group.heat)
            told.append(
                f"The warmest coil is that of {hot.heat_fiber}, at {_percent(hot.heat)} of what it may bear for ever"
                " (an estimate from duty and burst alone)."
            )
    if not found.landings:
        told.append("Nothing lands: no fiber moves.")
    elif not found.missed:
        told.append(f"All {found.landings} landings are met.")
    else:
        told.append(f"{found.missed} of {found.landings} landings miss. The worst: {'; '.join(map(_landing, found.closest))}.")
    return told


def _supply(found: Tonight) -> str:
    low = f"The receiver is lowest at bar {_bar_count(found.lowest_place)}, {found.lowest_kPa:.0f} kPa"
    spare = found.lowest_kPa - found.needed_kPa
    margin = f"{spare:.0f} kPa above what fibers need" if spare >= 0.0 else f"{-spare:.0f} kPa short of what fibers need"
    return f"{low}, {margin} ({found.needed_kPa:.0f} kPa); at the end it has {found.end_kPa:.0f} kPa."


def _landing(hit: CloseHit) -> str:
    line = f", line {hit.line}" if hit.line else ""
    how = "does not get there" if hit.late_s != hit.late_s else f"{hit.late_s:.2f} s late"
    return f"{hit.fiber} at bar {_bar_count(hit.place)} ({_percent(hit.error_of_stroke)} short, {how}{line})"


def as_json(found: Tonight) -> dict[str, Any]:
    """The same as JSON has it: keys as in the dataclasses, null for what is not known or never comes."""

    def plain(value: Any) -> Any:
        if isinstance(value, dict):
            return {key: plain(each) for key, each in value.items()}
        if isinstance(value, list | tuple):
            return [plain(each) for each in value]
        if isinstance(value, float):
            return None if value != value else round(value, 6) + 0.0
        return value

    return plain(asdict(found))


def _percent(share: float) -> str:
    return f"{100.0 * share:.0f} %" if share >= 0.01 else f"{100.0 * share:.1f} %"


def _bar_count(place: str) -> str:
    bar, _, count = place.partition(":")
    return f"{bar} count {float(count):.3g}"
