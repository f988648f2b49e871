"""The limit of air: the receiver never falls below its least pressure.

The receiver is a token bucket that is full at the start: its store is receiver_L (max_receiver_kPa - min_pressure_kPa) / 100
litres of free air (at 100 kPa), refilled by the compressor up to the cut-out. With water the same numbers stand for litres
of water and the pump's flow.

The air that all fibers have drawn up to an instant is a sum of curves. They are laid out as straight pieces between points
on the curves, which finds every span that may overdraw; the instants of the deepest are then closed in on with the
curves themselves, so that what is reported is exact.
"""

from collections.abc import Iterator
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from composer.fiber.mounting import Supply
from composer.limits.abilities import Abilities
from composer.limits.buckets import level
from composer.limits.fills import Fills, air_at, drawn_together, fills_of, sudden_strain
from composer.limits.limit import TOLERANCE, Limit
from composer.limits.quivering import shaken
from composer.limits.snag import Snag
from composer.limits.stretches import line_of
from composer.limits.swings import strain_of
from composer.limits.tables import travel_time_s
from composer.rig.model import Rig
from composer.shapes import NAMES
from composer.tracks import SAME_INSTANT_S, STEP, SUDDEN, Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]

FREE_AIR_KPA = 100.0
"""A litre of receiver gives up a litre of free air for each 100 kPa that it falls (ANR: 100 kPa)."""

PIECES, FEWEST, BUDGET = 16, 4, 1_000_000
"""Straight pieces a fill: sixteen, but four at least where a long score would need more pieces than the budget in all."""

CHORD = 0.72
"""A chord of a smooth fill cut into n pieces strays by at most this over n² of its litres: 10 / sqrt(3) / 8."""

GRID, ROUNDS = 33, 7
"""Points and rounds of closing in on an instant: each round narrows the window sixteen times."""

POINTS = np.linspace(0.0, 1.0, GRID)

DIPS, STARTS = 20, 4
"""Dips looked at closely, at most, between two instants at which the receiver is full, and spans that end in each."""


@dataclass(frozen=True, slots=True, eq=False)
class Demand:
    """Air drawn since the start as straight lines between rising instants, (N,) each; at the instants of a lone fill exact.

    strays_L: by how much a sum of chords may differ from the sum of curves, anywhere
    """

    time_s: Array
    litres: Array
    strays_L: float


@dataclass(frozen=True, slots=True)
class Use:
    """What the supply goes through: lowest pressure in kPa gauge, litres of free air in all, the spans that overdraw it.

    spans: (from_s, to_s, drawn_L, bears_L) each, in order of time; full_s: instants laid out at which the receiver is full
    asked: the air drawn, for pictures; alone: segments that overdraw the receiver by themselves, as `too_much_at_once`

    Of dips that differ by less than twice what the chords stray (`Demand.strays_L`) the lowest may be that of another.
    """

    lowest_kPa: float
    used_L: float
    spans: tuple[tuple[float, float, float, float], ...]
    full_s: Array = field(compare=False, repr=False)
    asked: Demand = field(compare=False, repr=False)
    alone: Index = field(compare=False, repr=False)


def store_L(supply: Supply) -> float:
    """What a full receiver can give before it is at its least pressure, in litres of free air."""
    return supply.receiver_L * (supply.max_receiver_kPa - supply.min_pressure_kPa) / FREE_AIR_KPA


def refill_L_s(supply: Supply) -> float:
    """What the compressor delivers, in litres of free air a second."""
    return supply.compressor_L_min / 60.0


def demand(tracks: Tracks, abilities: Abilities, fills: Fills | None = None) -> Demand:
    """The air drawn by all fibers together since the start, for cuts and pictures."""
    fills = fills_of(tracks, abilities) if fills is None else fills
    count = len(fills.fiber)
    if not count:
        return Demand(np.zeros(1), np.zeros(1), 0.0)
    pieces = np.full(count, max(FEWEST, min(PIECES, BUDGET // count)))
    straight = (tracks.shape[fills.segment] == NAMES.index("linear")) & even(abilities)[abilities.which[fills.fiber]]
    if (moves := shaken(tracks)) is not None:
        straight &= ~np.isin(fills.segment, moves.segment)
    pieces[straight | fills.at_once] = 1
    fill = np.repeat(np.arange(count), pieces + 1)
    number = np.arange(len(fill)) - np.repeat(np.cumsum(pieces + 1) - pieces - 1, pieces + 1)
    share = number / pieces[fill]
    time = fills.from_s[fill] + share * (fills.to_s[fill] - fills.from_s[fill])
    gone = litres_at_shares(tracks, abilities, fills, fill, share)
    last = number == pieces[fill]
    flow = np.zeros(len(fill))
    inner = np.flatnonzero(~last)
    flow[inner] = (gone[inner + 1] - gone[inner]) / np.maximum(time[inner + 1] - time[inner], 1e-12)
    before = np.concatenate([[0.0], flow[:-1]])
    before[number == 0] = 0.0
    order = np.argsort(time, kind="stable")
    time = np.concatenate([[0.0], time[order]])
    rates = np.concatenate([[0.0], np.cumsum((flow - before)[order])])
    litres = np.concatenate([[0.0], np.cumsum(np.maximum(rates[:-1], 0.0) * np.diff(time))])
    return Demand(time, litres, _strays(fills, pieces))


def litres_at_shares(tracks: Tracks, abilities: Abilities, fills: Fills, fill: Index, share: Array) -> Array:
    """Litres drawn by fills after shares of their time, (N,) each."""
    segment, fiber = fills.segment[fill], fills.fiber[fill]
    u = fills.u_from[fill] + share * (fills.u_to[fill] - fills.u_from[fill])
    strain = strain_of(tracks, segment, u)
    sudden = np.flatnonzero(tracks.manner[segment] == SUDDEN)
    if len(sudden):
        curve = tracks.curve[segment[sudden]]
        strain[sudden] = sudden_strain(abilities, fiber[sudden], curve[:, 0], curve.sum(axis=1), share[sudden])
    start = air_at(abilities, fills.fiber, strain_of(tracks, fills.segment, fills.u_from))
    return air_at(abilities, fiber, strain) - start[fill]


def even(abilities: Abilities) -> NDArray[np.bool_]:
    """(A,) whether a capability draws the same for every step of strain."""
    each = np.diff(abilities.air_L, axis=1) / np.diff(abilities.strain, axis=1)
    return np.ptp(each, axis=1) <= 1e-9 * np.abs(each).max(axis=1)


def _strays(fills: Fills, pieces: Index) -> float:
    """The greatest sum, over the fills under way at one instant, of what the chords of each may stray."""
    each = np.where(pieces == 1, 0.0, CHORD / pieces**2 * fills.litres)
    time = np.concatenate([fills.from_s, fills.to_s])
    order = np.argsort(time, kind="stable")
    return float(np.cumsum(np.concatenate([each, -each])[order]).max(initial=0.0))


def use(tracks: Tracks, supply: Supply, abilities: Abilities, fills: Fills | None = None) -> Use:
    """How a score uses the supply, with every span that asks for more than store and compressor give over it."""
    fills = fills_of(tracks, abilities) if fills is None else fills
    asked = demand(tracks, abilities, fills)
    store, refill = store_L(supply), refill_L_s(supply)
    now = level(asked.time_s, asked.litres, refill)
    exact = _Exact(tracks, abilities, fills, refill)
    deepest = int(now.missing.argmax())
    _, _, missing = exact.deepen(asked.time_s[now.since[deepest]], asked.time_s[deepest])
    spans = []
    slack = min(2.0 * asked.strays_L / store, 0.5) if store > 0.0 else 0.5
    dips = np.flatnonzero((now.missing > store * (1.0 - slack)) & _peaks(now.missing))
    short = asked.litres - refill * asked.time_s
    valleys = np.flatnonzero(_peaks(-short)) if len(dips) else dips
    dips = dips[np.lexsort((dips, -now.missing[dips], now.since[dips]))]
    for mine in np.split(dips, np.flatnonzero(np.diff(now.since[dips])) + 1) if len(dips) else ():
        # Where the dip that seems deepest is none when looked at closely, another that seemed less may be one.
        for start, end in _pairs(mine, valleys, short, 2.0 * asked.strays_L):
            if short[end] - short[start] + 2.0 * asked.strays_L <= store:
                continue  # whatever the curves do between the chords' ends, it bears this
            from_s, to_s, deep = exact.deepen(asked.time_s[start], asked.time_s[end])
            missing = max(missing, deep)
            if deep > store * (1.0 + TOLERANCE):
                bears = store + refill * (to_s - from_s)
                spans.append((from_s, to_s, deep - store + bears, bears))
                break
    lowest = supply.max_receiver_kPa - missing * FREE_AIR_KPA / supply.receiver_L
    alone = too_much_at_once(tracks, fills, supply, abilities) if spans else np.empty(0, dtype=np.int64)
    full_s = asked.time_s[now.missing <= 0.0]
    return Use(max(lowest, 0.0), float(fills.litres.sum()), tuple(spans), full_s, asked, alone)


def _peaks(values: Array) -> NDArray[np.bool_]:
    """(N,) where values neither rise on nor have been higher just before."""
    step = np.diff(values)
    return (np.append(True, step >= 0.0)) & (np.append(step <= 0.0, True))


def _pairs(ends: Index, valleys: Index, short: Array, strays_L: float) -> Iterator[tuple[int, int]]:
    """Begin and end of the spans that may ask most, those that seem to ask most first; (N,) `short` is demand less refill."""
    for end in ends[:DIPS].tolist():
        before = valleys[: np.searchsorted(valleys, end)]
        low = short[before]
        near = before[low <= low.min(initial=np.inf) + strays_L]
        for start in near[np.argsort(short[near], kind="stable")][:STARTS].tolist():
            yield start, end


def too_much_at_once(tracks: Tracks, fills: Fills, supply: Supply, abilities: Abilities) -> Index:
    """The sudden moves and jumps, as segments, that no other times help: those that land together draw more than a full
    receiver bears, and they land together whenever it is."""
    mine = np.flatnonzero(np.isin(tracks.manner[fills.segment], (SUDDEN, STEP)))
    if not len(mine):
        return mine
    mine = mine[np.argsort(tracks.time_s[fills.segment[mine] + 1], kind="stable")]
    segment, fiber, litres = fills.segment[mine], fills.fiber[mine], fills.litres[mine]
    curve = tracks.curve[segment]
    lasts = travel_time_s(abilities, fiber, curve[:, 0], curve.sum(axis=1))
    lasts[tracks.manner[segment] == STEP] = 0.0
    together = np.cumsum(np.diff(tracks.time_s[segment + 1], prepend=-1.0) > SAME_INSTANT_S) - 1
    longest = np.zeros(together[-1] + 1)
    np.maximum.at(longest, together, lasts)
    over = np.bincount(together, weights=litres) - refill_L_s(supply) * longest > store_L(supply) * (1.0 + TOLERANCE)
    return np.sort(segment[over[together]])


class _Exact:
    """The curves themselves, asked in small windows of time."""

    def __init__(self, tracks: Tracks, abilities: Abilities, fills: Fills, refill: float):
        self.tracks, self.abilities, self.fills, self.refill = tracks, abilities, fills, refill
        order = np.argsort(fills.to_s, kind="stable")
        self.ends = fills.to_s[order]
        self.total = np.concatenate([[0.0], np.cumsum(fills.litres[order])])

    def deepen(self, from_s: float, to_s: float) -> tuple[float, float, float]:
        """A span near this one that is the deepest there: from, to, and the litres missing at its end."""
        # Demand less refill falls on and on where nothing is drawn: the end lies after the start, and the start before it.
        (start, end), (lowest, highest) = self._extremes([from_s, to_s], [-1.0, 1.0], [0.0, from_s], [to_s, np.inf])
        if start > end:
            (start,), (lowest,) = self._extremes([from_s], [-1.0], [0.0], [end])
        return (start, end, highest - lowest) if end > start else (from_s, from_s, 0.0)

    def _extremes(
        self, near: list[float], sign: list[float], at_least: list[float], at_most: list[float]
    ) -> tuple[Array, Array]:
        """Where, about some instants and within bounds, demand less refill is least (sign -1) or greatest (1), and it."""
        near_s, way, from_s, to_s = (np.array(values)[:, None] for values in (near, sign, at_least, at_most))
        fills = self.fills
        under_way = (fills.from_s <= near_s) & (fills.to_s >= near_s)
        width = np.where(under_way, fills.to_s - fills.from_s, 0.0).max(axis=1, initial=0.0)[:, None] / FEWEST
        low, high = np.maximum(near_s - width, from_s), np.minimum(near_s + width, to_s)
        under_way = np.flatnonzero(np.any((fills.to_s > low) & (fills.from_s < high), axis=0))
        drawn = drawn_together(self.tracks, self.abilities, fills, under_way)
        mine = np.sort(fills.to_s[under_way])
        ended = np.concatenate([[0.0], np.cumsum(fills.litres[under_way][np.argsort(fills.to_s[under_way], kind="stable")])])

        def short_at(time_s: Array) -> Array:
            at = time_s.ravel()
            # Of the fills that have ended those under way are told by their curves.
            others = self.total[np.searchsorted(self.ends, at, "right")] - ended[np.searchsorted(mine, at, "right")]
            return (others + drawn(at) - self.refill * at).reshape(time_s.shape)

        best_s, best = near_s, short_at(near_s)
        for _ in range(ROUNDS if width.any() else 0):
            grid = low + (high - low) * POINTS
            short = short_at(grid)
            at = (way * short).argmax(axis=1)[:, None]
            found = np.take_along_axis(short, at, 1)
            better = way * found > way * best
            best_s, best = np.where(better, np.take_along_axis(grid, at, 1), best_s), np.where(better, found, best)
            step = grid[:, 1:2] - grid[:, :1]
            low, high = np.maximum(best_s - step, from_s), np.minimum(best_s + step, to_s)
        return best_s[:, 0], best[:, 0]


def blame(tracks: Tracks, fills: Fills, from_s: float, to_s: float) -> int:
    """The segment whose line of the score draws the most between two instants, -1 where none does."""
    there = np.flatnonzero((fills.from_s < to_s) & (fills.to_s > from_s))
    if not len(there):
        return -1
    line = tracks.line[fills.segment[there]]
    by_line = np.bincount(line, weights=fills.litres[there])
    mine = there[line == by_line.argmax()]
    return int(fills.segment[mine[fills.litres[mine].argmax()]])


def snags(tracks: Tracks, rig: Rig, abilities: Abilities) -> list[Snag]:
    """The spans that ask for too much air, the deepest of each stretch in which the receiver is not full again.

    From and to are the span; needs the litres drawn in it, has the store and what the compressor delivers over it; the line
    is the one that draws the most. Where what is sudden draws too much at once one such move is the knot: no times mend it.
    """
    return snags_of(use(tracks, rig.supply, abilities), tracks, abilities)


def snags_of(used: Use, tracks: Tracks, abilities: Abilities) -> list[Snag]:
    """The snags of a use that is known already."""
    if not used.spans:
        return []
    fills = fills_of(tracks, abilities)
    found = []
    for from_s, to_s, asked, bears in used.spans:
        begin = tracks.time_s[used.alone]
        within = used.alone[(begin < to_s) & (begin >= from_s - SAME_INSTANT_S)]
        alone = int(within[0]) if len(within) else -1
        knot = alone if alone >= 0 else blame(tracks, fills, from_s, to_s)
        line = line_of(tracks, knot) if knot >= 0 else 0
        found.append(Snag("air", None, from_s, to_s, asked, bears, "L", alone, line, alone < 0))
    return found


LIMIT = Limit("air", "L", "air drawn in any span at most the receiver's store and the compressor's delivery over it", snags)
