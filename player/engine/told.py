"""A run's log told afterwards: what was wanted, sent and sensed, as arrays; how far off each landing was. Pure."""

from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from player.engine.run_log import FULL, Record

Array = NDArray[np.float64]

GAP_S = 0.2
"""Where sets are further apart, as after a fault, nothing was wanted between them."""

SENSED_AFTER_S = 0.25
"""A landing is judged by the first sense from its instant on, if that comes within so many seconds."""

LATENESS_MS = (0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0)
"""Upper edges of the classes of ticks' lateness; a last class has what is later."""


@dataclass(frozen=True, slots=True, eq=False)
class Sensed:
    """What was sensed of some fibers (S,): at (N,) s of the engine's clock, as shares of stroke (N, S)."""

    fibers: NDArray[np.int64]
    at_s: Array
    share: Array


@dataclass(frozen=True, slots=True, eq=False)
class Told:
    """A log's contents. Times in s of the engine's clock; F fibers, N sets.

    in_force_s: (N,) when what a set stands for is wanted; late_s, position_s: (N,); sent: (N, F) numbers on the wire
    wanted: (N, F) shares of stroke, nan where not known; slipped: (N,) whether the score was held up just before
    happened: states, commands, boards' words, slips and alarms as records, in order; end: the object of the run's report
    """

    head: dict[str, Any]
    in_force_s: Array
    late_s: Array
    position_s: Array
    sent: NDArray[np.uint16]
    wanted: Array
    sensed: tuple[Sensed, ...]
    supply: tuple[tuple[int, float, float], ...]
    hits: tuple[tuple[float, str, tuple[int, ...]], ...]
    happened: tuple[Record, ...]
    end: dict[str, Any] | None

    @property
    def fibers(self) -> tuple[str, ...]:
        """Names, in the rig's order."""
        return tuple(self.head["fibers"])


@dataclass(frozen=True, slots=True)
class Landing:
    """How far off one fiber was at one hit, in shares of stroke; `error` is sensed less wanted."""

    place: str
    at_s: float
    fiber: int
    wanted: float
    sensed: float
    error: float
    strain_error: float


class Senseless(ValueError):
    """The records are whole, but make no log of a run; the text says what is missing."""


@dataclass(slots=True)
class _Kept:
    values: list[Any] = field(default_factory=list)
    times: list[float] = field(default_factory=list)


def told(found: Iterable[Record]) -> Told:
    """A log from its records; those that do not fit the head are left out.

    Raises:
        Senseless: there is no head, or none that says which fibers.
    """
    head: dict[str, Any] | None = None
    sets: list[tuple[float, float, float, Any, Any]] = []
    layouts: dict[int, NDArray[np.int64]] = {}
    sensed: dict[int, _Kept] = {}
    supply, hits, happened, end = [], [], [], None
    for record in found:
        kind = record.kind
        if head is None:
            head = _checked(record)
            fibers = len(head["fibers"])
        elif kind in ("set", "sent"):
            if len(record.values) == fibers:
                sets.append((record.due_s, record.late_s, record.position_s, record.values, record.wanted))
        elif kind == "layout":
            _layout(record.told, fibers, layouts)
        elif kind == "sense":
            if record.number in layouts and len(record.values) == len(layouts[record.number]):
                kept = sensed.setdefault(record.number, _Kept())
                kept.values.append(record.values)
                kept.times.append(record.due_s)
        elif kind == "supply":
            supply.append((record.number, record.time_s, record.kPa))
        elif kind == "hits":
            hits += _hits(record.told, fibers)
        elif kind == "end":
            end = record.told
        else:
            happened.append(record)
    if head is None:
        raise Senseless("nothing of it is whole")
    return _arrays(head, sets, layouts, sensed, supply, hits, happened, end)


def _checked(record: Record) -> dict[str, Any]:
    """The head, if it is one."""
    head = record.told
    names, stroke = head.get("fibers"), head.get("stroke")
    lists = isinstance(names, list) and isinstance(stroke, list) and len(names) == len(stroke) > 0
    if record.kind != "head" or not lists or not all(isinstance(name, str) for name in names):
        raise Senseless("it does not begin by saying what was played")
    numbers = [*stroke, head.get("rate_Hz"), head.get("lead_s")]
    if not all(isinstance(one, int | float) and not isinstance(one, bool) and 0.0 <= one < 1e6 for one in numbers):
        raise Senseless("its head does not say how fast, or how far, fibers go")
    if head["rate_Hz"] <= 0.0:
        raise Senseless("its head says no rate")
    return head


def _layout(say: dict[str, Any], fibers: int, layouts: dict[int, NDArray[np.int64]]) -> None:
    number, which = say.get("layout"), say.get("fibers")
    if isinstance(number, int) and isinstance(which, list) and all(type(one) is int and 0 <= one < fibers for one in which):
        layouts[number] = np.array(which, dtype=np.int64)


def _hits(say: dict[str, Any], fibers: int) -> list[tuple[float, str, tuple[int, ...]]]:
    found = []
    told = say.get("hits")
    for hit in told if isinstance(told, list) else ():
        if isinstance(hit, list) and len(hit) == 3 and type(hit[0]) is int and isinstance(hit[2], list):
            which = tuple(one for one in hit[2] if type(one) is int and 0 <= one < fibers)
            found.append((hit[0] * 1e-6, str(hit[1]), which))
    return found


def _arrays(head, sets, layouts, sensed, supply, hits, happened, end) -> Told:
    fibers = len(head["fibers"])
    nothing = np.full(fibers, -1, dtype=np.int64)
    wanted = np.array([nothing if one[4] is None else one[4] for one in sets], dtype=float).reshape(len(sets), fibers)
    wanted[wanted < 0.0] = np.nan
    return Told(
        head=head,
        in_force_s=np.array([one[0] for one in sets]) + head["lead_s"] + 1.0 / head["rate_Hz"],
        late_s=np.array([one[1] for one in sets]),
        position_s=np.array([one[2] for one in sets]),
        sent=np.array([one[3] for one in sets], dtype=np.uint16).reshape(len(sets), fibers),
        wanted=wanted / FULL,
        sensed=tuple(
            Sensed(layouts[number], np.array(kept.times), np.array(kept.values, dtype=float) / FULL)
            for number, kept in sensed.items()
        ),
        supply=tuple(supply),
        hits=tuple(hits),
        happened=tuple(happened),
        end=end,
    )


def wanted_at(log: Told, at_s: Array, fibers: NDArray[np.int64]) -> Array:
    """Shares of stroke (N, S) wanted at times (N,), a straight line between sets; nan where nothing was sent.

    The last want of a run that came to rest stands for SENSED_AFTER_S.
    """
    times = log.in_force_s
    if len(times) < 2:
        return np.full((len(at_s), len(fibers)), np.nan)
    later = np.clip(np.searchsorted(times, at_s), 1, len(times) - 1)
    span = times[later] - times[later - 1]
    part = np.minimum(np.divide(at_s - times[later - 1], span, out=np.ones_like(at_s), where=span > 0.0), 1.0)[:, None]
    before, after = log.wanted[later - 1][:, fibers], log.wanted[later][:, fibers]
    # What a run comes to rest with stands for a while; what it was vented from does not.
    stands_s = SENSED_AFTER_S if log.end is not None and log.end.get("ended") in ("end", "stopped") else 0.0
    inside = (at_s >= times[0] - 1e-9) & (at_s <= times[-1] + stands_s + 1e-9) & (span <= GAP_S)
    return np.where(inside[:, None], before + part * (after - before), np.nan)


def landings(log: Told) -> list[Landing]:
    """Every hit that was played and sensed, worst first; wanted and sensed are those of one instant, just after the hit."""
    found: list[Landing] = []
    if len(log.position_s) < 2:
        return found
    step = np.diff(log.position_s)
    # A jump of the score passes over places without playing them.
    usual = 1.5 / log.head["rate_Hz"]
    walked = (step > 0.0) & (step <= usual)
    for at_s, place, which in log.hits:
        passed = np.flatnonzero(walked & (log.position_s[:-1] < at_s - 1e-5) & (log.position_s[1:] >= at_s - 1e-5))
        for tick in passed:
            share = (at_s - log.position_s[tick]) / step[tick]
            when = log.in_force_s[tick] + share * (log.in_force_s[tick + 1] - log.in_force_s[tick])
            found += _landed(log, place, at_s, when, which)
    found.sort(key=lambda one: -abs(one.error))
    return found


def _landed(log: Told, place: str, at_s: float, when_s: float, which: tuple[int, ...]) -> list[Landing]:
    found = []
    for part in log.sensed:
        columns = np.flatnonzero(np.isin(part.fibers, which))
        first = int(np.searchsorted(part.at_s, when_s - 1e-6))
        if first and first == len(part.at_s) and when_s - part.at_s[-1] <= 1.5 / log.head["rate_Hz"]:
            # The landing that ends the score: nothing is sensed behind it, but there is a sense of the tick before.
            first -= 1
        if not columns.size or first == len(part.at_s) or part.at_s[first] - when_s > SENSED_AFTER_S:
            continue
        fibers = part.fibers[columns]
        wanted = wanted_at(log, part.at_s[first : first + 1], fibers)[0]
        for fiber, want, sense in zip(fibers.tolist(), wanted, part.share[first, columns], strict=True):
            if np.isfinite(want):
                error = float(sense - want)
                found.append(Landing(place, at_s, fiber, float(want), float(sense), error, error * log.head["stroke"][fiber]))
    return found


def lateness(log: Told) -> list[tuple[float, int]]:
    """How many ticks came within each of LATENESS_MS beyond the class before; the last class, inf, is later than all."""
    edges = np.array((-np.inf, *LATENESS_MS, np.inf))
    counts, _ = np.histogram(log.late_s * 1e3, edges)
    return list(zip([*LATENESS_MS, np.inf], counts.tolist(), strict=True))


def apart(log: Told) -> Array:
    """Mean and largest distance of sensed from wanted for each fiber, shares of stroke (F, 3): mean signed, mean, largest."""
    fibers = len(log.fibers)
    signed, size, most, count = np.zeros(fibers), np.zeros(fibers), np.zeros(fibers), np.zeros(fibers)
    for part in log.sensed:
        error = part.share - wanted_at(log, part.at_s, part.fibers)
        known = np.isfinite(error)
        error = np.where(known, error, 0.0)
        np.add.at(signed, part.fibers, error.sum(axis=0))
        np.add.at(size, part.fibers, np.abs(error).sum(axis=0))
        np.maximum.at(most, part.fibers, np.abs(error).max(axis=0, initial=0.0))
        np.add.at(count, part.fibers, known.sum(axis=0))
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.stack([signed / count, size / count, np.where(count > 0, most, np.nan)], axis=1)
