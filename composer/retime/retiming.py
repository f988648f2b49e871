"""Retiming: the least change of times with which a rig can do a score, and what it changed."""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.limits.snag import Snag
from composer.retime.apply import retimed
from composer.retime.flow import Budget
from composer.retime.memory import Memory
from composer.retime.pins import Chain, chains_too_long
from composer.retime.polish import polish
from composer.retime.proof import KINDS, Proof
from composer.retime.rows import AIR_ROW
from composer.retime.shrink import Shrunk, factor_that_fits, scaled
from composer.retime.solving import Answer, answer
from composer.retime.stage import Stage, at_times, durations_to_keep, stage_of
from composer.retime.terms import cost
from composer.rig.model import Rig
from composer.tracks import SAME_INSTANT_S, Tracks, fiber_of

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]

KEEPS = ("clock", "rhythm")

SHRINKS = 1000
"""How many chains `shrink` takes on, one after another, before it gives up."""


@dataclass(frozen=True, slots=True)
class MovedHit:
    """A hit that moved: its instants, the fibers whose moves land in it, one of those moves (segment) and its line."""

    was_s: float
    now_s: float
    fibers: tuple[int, ...]
    knot: int
    line: int


@dataclass(frozen=True, slots=True)
class Lead:
    """A free start that moved against what it keeps: instants, segment and line."""

    fiber: int
    was_s: float
    now_s: float
    knot: int
    line: int


@dataclass(frozen=True, slots=True)
class ShrunkMove:
    """A move that went `factor` of its way: where it lands as written, segment and line."""

    fiber: int
    was_s: float
    factor: float
    knot: int
    line: int


@dataclass(frozen=True, slots=True)
class PinsShort:
    """Two pins (or the start and a pin) too close: seconds lacking, fibers in the chain, the factor that would fit."""

    from_s: float
    to_s: float
    short_s: float
    fibers: tuple[int, ...]
    lines: tuple[int, ...]
    factor: float


@dataclass(frozen=True, slots=True)
class Hopeless:
    """What no times keep, pins or none, given what else must happen meanwhile: a snag of that kind and fiber is left there.

    kind: "hold", "duty", "switching" or "air"; fiber: None for air; from_s, to_s: instants as retimed that it is about
    """

    kind: str
    fiber: int | None
    from_s: float
    to_s: float


@dataclass(frozen=True, slots=True, eq=False)
class Retiming:
    """What retiming came to; times in seconds, cost and bound in stroke-seconds (nan where pins leave no answer).

    tracks: the new tracks; those as written where pins are too close
    bound: proven: no retiming costs less
    pins_s: (P,) the pins in order of time; proof: what causes and pins' costs are read from, None where pins leave no answer
    memory: for a retiming after this one; stopped: whether time was up before these times were proven the best
    warp_was_s, warp_now_s: 0, the hits and the score's end as written and as retimed, (W,) each, rising
    """

    keep: str
    tracks: Tracks
    hits_moved: tuple[MovedHit, ...]
    leads: tuple[Lead, ...]
    shrunk: tuple[ShrunkMove, ...]
    pins_short: tuple[PinsShort, ...]
    cost: float
    bound: float
    solve_s: float
    was_s: float
    warp_was_s: Array
    warp_now_s: Array
    pins_s: Array
    proof: Proof | None = field(repr=False)
    memory: Memory = field(repr=False)
    stopped: bool = False
    hopeless: tuple[Hopeless, ...] = ()

    def mends(self, snag: Snag) -> bool:
        """Whether time alone can mend a snag that is left in the new tracks."""
        return snag.mends and not any(
            one.kind == snag.kind and one.fiber == snag.fiber and one.from_s <= snag.to_s and one.to_s >= snag.from_s
            for one in self.hopeless
        )


def retime(
    tracks: Tracks,
    abilities: Abilities,
    rig: Rig,
    pins_s: Array,
    keep: str = "clock",
    shrink: bool = False,
    give_s: Array | None = None,
    firm: Array | None = None,
    rhythm: Flags | None = None,
    whole: bool = False,
    limit_s: float = np.inf,
    clock: Callable[[], float] = lambda: 0.0,
    tell: Callable[[str], None] | None = None,
    after: Retiming | None = None,
) -> Retiming:
    """The least change of times after which the rig can do the score.

    pins_s: (P,) instants that must not move, `give_s` (P,) how far each may after all (0 where not given)
    keep: "clock" (instants) or "rhythm" (the intervals between hits); rhythm (K,) where it differs by segment
    firm: (K,) how many times as costly each segment is to move
    whole: solve all at once rather than round the snags (for comparison; the answer costs the same)
    after: a retiming of nearly the same score for the same abilities, from which what has not changed is taken
    clock: what says the time in seconds, for `solve_s`; without one that is 0
    limit_s: how long the search may take by that clock; then the best times known are the answer, if there are any
    tell: hears what is being done, and "" at the end
    Raises Unsolved where the solver fails or time is up and no times are known.
    """
    began = clock()
    pins = np.sort(np.asarray(pins_s, dtype=float))
    give = np.zeros(len(pins)) if give_s is None else np.asarray(give_s, dtype=float)[np.argsort(pins_s, kind="stable")]
    by_rhythm: bool | Flags = rhythm if rhythm is not None else keep == "rhythm"

    def build(some: Tracks) -> Stage:
        return stage_of(some, abilities, pins, give, firm, by_rhythm, None if after is None else after.memory)

    def too_long(stage: Stage) -> list[Chain]:
        return chains_too_long(stage.events, stage.rows, pins, give) if len(pins) else []

    stage = build(tracks)
    chains = too_long(stage) if shrink else []
    shrunk: dict[int, Shrunk] = {}
    tries = 0
    while chains and shrink and tries < SHRINKS:
        current, hopeless = stage.tracks, True
        fiber, done = fiber_of(current), set()
        for chain in chains:
            # A move that follows a shrunk one starts from elsewhere now: its chain is counted anew in the next round.
            if done & set(fiber[list(chain.knots)].tolist()):
                continue
            factor = factor_that_fits(current, chain, lambda some, k: durations_to_keep(some, abilities, k))
            tries += 1
            if factor <= 0.0:
                continue
            hopeless = False
            done.update(fiber[list(chain.knots)].tolist())
            current = scaled(current, np.array(chain.knots), factor)
            for k in chain.knots:
                written = int(stage.origin[k])
                before = shrunk[written].factor if written in shrunk else 1.0
                shrunk[written] = Shrunk(int(fiber_of(tracks)[written]), written, before * factor)
        if hopeless:
            break
        tracks = retimed(current, stage.origin, current.time_s, tracks.duration_s)
        stage = build(tracks)
        chains = too_long(stage)
    budget = Budget(clock, began + limit_s, tell)
    found = None if chains else answer(stage, rig, abilities, whole, budget, _as_before(stage, after))
    if found is None and not chains:
        chains = too_long(stage)
    budget.say("")
    short = tuple(_short(chain, stage, abilities) for chain in chains)
    return _told(stage, tracks, abilities, pins, keep, found, shrunk, short, clock() - began)


def _as_before(stage: Stage, after: Retiming | None) -> Flags | None:
    """(N,) the events at instants at which the retiming before had some that moved: a good guess at what will move now."""
    if after is None or after.proof is None:
        return None
    moved = np.sort(after.proof.events.written_s[after.proof.shift_s != 0.0])
    if not len(moved):
        return None
    written = stage.events.written_s
    place = np.searchsorted(moved, written)
    behind, ahead = moved[np.maximum(place - 1, 0)], moved[np.minimum(place, len(moved) - 1)]
    apart = np.minimum(np.abs(ahead - written), np.abs(written - behind))
    return apart <= SAME_INSTANT_S


def _short(chain: Chain, stage: Stage, abilities: Abilities) -> PinsShort:
    fiber = fiber_of(stage.tracks)
    return PinsShort(
        chain.from_s,
        chain.to_s,
        chain.short_s,
        tuple(dict.fromkeys(int(fiber[k]) for k in chain.knots)),
        tuple(dict.fromkeys(int(stage.tracks.line[k]) for k in chain.knots)),
        factor_that_fits(stage.tracks, chain, lambda some, k: durations_to_keep(some, abilities, k)),
    )


def _told(
    stage: Stage,
    tracks: Tracks,
    abilities: Abilities,
    pins_s: Array,
    keep: str,
    found: Answer | None,
    shrunk: dict[int, Shrunk],
    short: tuple[PinsShort, ...],
    solve_s: float,
) -> Retiming:
    """The retiming in the terms of who reads it."""
    events, prepared, origin = stage.events, stage.tracks, stage.origin
    terms = stage.terms
    hits = events.hits
    was = np.concatenate(([0.0], events.written_s[:hits]))
    fiber = fiber_of(prepared)
    shift = np.zeros(len(events.written_s)) if found is None else polish(events, found.rows, found.least.shift_s)
    now = was + np.concatenate(([0.0], shift[:hits]))

    moved_hits = np.flatnonzero(shift[:hits] != 0.0)
    landed = np.flatnonzero(events.arrival)
    landed = landed[np.argsort(events.event[landed], kind="stable")]
    of_hit = np.searchsorted(events.event[landed], np.arange(hits + 1))
    told_hits = []
    for hit in moved_hits.tolist():
        ends = landed[of_hit[hit] : of_hit[hit + 1]]
        lines = [int(prepared.line[k - 1]) for k in ends if prepared.line[k - 1] > 0]
        told_hits.append(
            MovedHit(
                float(was[hit + 1]),
                float(now[hit + 1]),
                tuple(dict.fromkeys(fiber[ends].tolist())),
                int(origin[ends[0] - 1]),
                min(lines, default=0),
            )
        )
    own = shift[hits:] - np.append(shift, 0.0)[terms.behind[hits:]]
    starts = np.flatnonzero(events.free)
    left = np.flatnonzero(np.abs(own) > 1e-9)
    at = starts[left]
    was_start = events.written_s[hits + left]
    columns = (fiber[at], was_start, was_start + shift[hits + left], origin[at], prepared.line[at])
    leads = [Lead(*row) for row in zip(*(column.tolist() for column in columns), strict=True)]
    new = tracks
    if found is not None:
        now_there = at_times(stage, shift)
        new = retimed(prepared, origin, now_there.time_s, now_there.duration_s)
    return Retiming(
        keep=keep,
        tracks=new,
        hits_moved=tuple(told_hits),
        leads=tuple(leads),
        shrunk=tuple(
            ShrunkMove(one.fiber, float(tracks.time_s[one.knot + 1]), one.factor, one.knot, int(tracks.line[one.knot]))
            for one in shrunk.values()
        ),
        pins_short=short,
        cost=cost(terms, shift) if found is not None else float("nan"),
        bound=found.least.bound if found is not None else float("nan"),
        solve_s=solve_s,
        was_s=tracks.duration_s,
        pins_s=pins_s,
        memory=stage.memory,
        stopped=found is not None and found.stopped,
        hopeless=() if found is None else _hopeless(found, prepared, fiber, now_there.time_s),
        proof=_proof(stage, found, shift, abilities, len(pins_s)),
        **_warp(was, now, tracks.duration_s, new.duration_s),
    )


def _hopeless(found: Answer, prepared: Tracks, fiber: Index, time_s: Array) -> tuple[Hopeless, ...]:
    told = []
    for kind, knot in found.hopeless:
        if kind == AIR_ROW or knot < 0:
            told.append(Hopeless(KINDS[kind], None, 0.0, np.inf))
        else:
            to_s = float(time_s[knot + 1]) if knot + 1 < prepared.first[fiber[knot] + 1] else np.inf
            told.append(Hopeless(KINDS[kind], int(fiber[knot]), float(time_s[knot]), to_s))
    return tuple(told)


def _proof(stage: Stage, found: Answer | None, shift: Array, abilities: Abilities, pins: int) -> Proof | None:
    if found is None:
        return None
    return Proof(
        stage.tracks,
        stage.least_s,
        stage.events,
        found.rows,
        stage.terms,
        shift,
        found.least.dual,
        abilities,
        pins,
    )


def _warp(was: Array, now: Array, was_end_s: float, now_end_s: float) -> dict[str, Array]:
    """The warp with the score's end, where that comes after the last hit as written."""
    if was_end_s > was[-1] and now_end_s >= now[-1]:
        was, now = np.append(was, was_end_s), np.append(now, now_end_s)
    return {"warp_was_s": was, "warp_now_s": now}
