"""Small scores that are short of air, and a long search for their cheapest times that knows nothing of rows, cuts or duals.

Written from the page on retiming alone: a population of guesses at the times, each pushed later until moves, holds and the
order of hits have what they need, judged by its cost and by what a receiver reckoned at many instants lacks. Differential
evolution (Storn and Price 1997) begins, and a search along random lines closes in.
"""

from dataclasses import dataclass

import numpy as np

from .scores import tracks_of

STROKE, FILL, EXHAUST = 0.3, 0.6, 0.3
SPEED = {"linear": 1.0, "smooth": 1.875}
COARSE, FINE = 16, 160
"""Instants within each smooth fill at which the receiver is reckoned, at first and while closing in."""

PEOPLE, ROUNDS, LINES = 96, 400, 4000


@dataclass(frozen=True)
class Scarce:
    """A score as lists of (second, target, shape), and its supply: litres a whole stroke draws, store and litres a second."""

    fibers: list
    air_mL: float
    store_L: float
    refill_L_s: float

    @property
    def tracks(self):
        return tracks_of(self.fibers)

    def rig(self, make_rig):
        """A rig of this supply: 350 kPa of use in the receiver."""
        return make_rig(
            len(self.fibers), stroke=STROKE, fill=FILL, exhaust=EXHAUST, air_mL=self.air_mL,
            receiver_L=self.store_L / 3.5, compressor_L_min=60.0 * self.refill_L_s,
        )  # fmt: skip


def scarce(seed: int) -> Scarce:
    """Two to four fibers with one to three fills each, on a grid of quarter seconds, and a receiver that does not bear them."""
    rng = np.random.default_rng(seed)
    fibers, litres, ends = [], 0.0, 0.0
    for _ in range(int(rng.integers(2, 4))):
        at, value, one = 0.0, 0.0, []
        for _ in range(int(rng.integers(1, 3))):
            if rng.random() < 0.8:
                one.append((at, None, "hold"))
                at += 0.25 * int(rng.integers(1, 8))
            target = float(rng.choice([0.15, 0.2, 0.3]))
            if value > 0.0 and (rng.random() < 0.7 or target <= value):
                one.append((at, 0.0, "linear"))
                at, value = at + 0.25 * np.ceil(value / EXHAUST / 0.25 + rng.integers(0, 3)), 0.0
                if rng.random() < 0.5:
                    one.append((at, None, "hold"))
                    at += 0.25 * int(rng.integers(1, 6))
            shape = str(rng.choice(["linear", "smooth"]))
            one.append((at, target, shape))
            at += 0.25 * np.ceil(SPEED[shape] * (target - value) / FILL / 0.25 + rng.integers(0, 4))
            litres, value = litres + 0.03 * (target - value) / STROKE, target
        fibers.append([*one, (at, None, "end")])
        ends = max(ends, at)
    store = litres * rng.uniform(0.25, 0.6)
    return Scarce(fibers, 30.0, store, (litres - store) / (ends * rng.uniform(0.9, 1.6)))


class Search:
    """The times of hits and free starts of a score, and what a choice of them costs and lacks."""

    def __init__(self, score: Scarce, keep: str):
        self.score, self.keep = score, keep
        landings = sorted({one[n + 1][0] for one in score.fibers for n in range(len(one) - 1) if one[n][2] != "hold"})
        self.written = list(landings)
        weight = dict.fromkeys(landings, 0.0)
        self.own, lead = list(range(len(landings))), []
        # Each knot of each fiber is (event or -1), each move (from event, to event, least, rising, litres).
        self.floors: dict[int, list[tuple[int, float]]] = {n: [(n - 1, 0.0)] for n in range(len(landings))}
        self.ceilings: list[tuple[int, int, float]] = []
        self.fills = []
        for one in score.fibers:
            event, value = -1, 0.0
            for n, (_, target, shape) in enumerate(one[:-1]):
                if shape == "hold":
                    if one[n + 1][2] in ("end", "hold"):
                        continue
                    self.written.append(one[n + 1][0])
                    start = len(self.written) - 1
                    self.floors[start] = [(event, 0.0)]
                    event = start
                    continue
                way = target - value
                least = SPEED[shape] * abs(way) / (FILL if way > 0.0 else EXHAUST)
                hit = landings.index(one[n + 1][0])
                weight[landings[hit]] += abs(way) / STROKE
                if event >= len(landings):
                    lead.append(abs(way) / STROKE / 20.0)
                    self.own.append(hit)
                self.floors[hit].append((event, least))
                if way > 0.0:
                    self.fills.append((event, hit, shape, score.air_mL / 1000.0 * way / STROKE))
                event, value = hit, target
        self.hits = len(landings)
        self.weight = np.array([weight[at] for at in landings] + lead)
        self.written = np.array(self.written)
        # From first to last: what an event waits for comes before it; a start lies before its hit and after what it follows.
        self.order = self._order()
        shapes = np.array([shape == "smooth" for _, _, shape, _ in self.fills])
        self.smooth = shapes
        self.begin = np.array([begin for begin, *_ in self.fills])
        self.end = np.array([end for _, end, *_ in self.fills])
        self.litres = np.array([litres for *_, litres in self.fills])
        self.sample(COARSE)
        self.price = 4.0 * float(self.weight.sum())

    def sample(self, inner: int) -> None:
        """Reckon the receiver at so many instants within each smooth fill, and at the ends of every fill."""
        share = np.linspace(0.0, 1.0, inner + 2)
        nodes = [(n, u) for n, bent in enumerate(self.smooth) for u in (share if bent else (0.0, 1.0))]
        self.of, self.share = np.array([n for n, _ in nodes]), np.array([u for _, u in nodes])

    def _order(self) -> list[int]:
        done: list[int] = []
        while len(done) < len(self.written):
            for event in range(len(self.written)):
                if event not in done and all(before < 0 or before in done for before, _ in self.floors[event]):
                    done.append(event)
        return done

    def times(self, own: np.ndarray) -> np.ndarray:
        """(N, S) times from what the score keeps: times themselves, or intervals between hits and from starts to their hits."""
        if self.keep == "clock":
            return own
        times = np.cumsum(own[: self.hits], axis=0)
        return np.vstack([times, times[self.own[self.hits :]] - own[self.hits :]])

    def kept(self, times: np.ndarray) -> np.ndarray:
        """(N, S) what the score keeps of some times."""
        if self.keep == "clock":
            return times
        hits = times[: self.hits]
        return np.vstack([np.diff(hits, axis=0, prepend=0.0), hits[self.own[self.hits :]] - times[self.hits :]])

    def pushed(self, own: np.ndarray) -> np.ndarray:
        """(N, S) times made possible: each event no earlier than what it follows allows."""
        made = np.maximum(self.times(own), 0.0)
        for event in self.order:
            for before, least in self.floors[event]:
                np.maximum(made[event], (made[before] if before >= 0 else 0.0) + least, out=made[event])
        return made

    def cost(self, made: np.ndarray) -> np.ndarray:
        """(S,) stroke-seconds."""
        return self.weight @ np.abs(self.kept(made) - self.kept(self.written[:, None]))

    def lacks(self, made: np.ndarray) -> np.ndarray:
        """(S,) litres by which the receiver falls below its least, from samples; 0 where it bears all."""
        padded = np.vstack([made, np.zeros(made.shape[1])])
        begin, end = padded[self.begin], padded[self.end]
        lasts = end - begin
        at = begin[self.of] + self.share[:, None] * lasts[self.of]
        at.sort(axis=0)
        u = np.clip((at[None] - begin[:, None]) / np.maximum(lasts, 1e-9)[:, None], 0.0, 1.0)
        bent = u[self.smooth]
        u[self.smooth] = bent**3 * (10.0 - 15.0 * bent + 6.0 * bent**2)
        short = np.tensordot(self.litres, u, axes=1) - self.score.refill_L_s * at
        missing = short - np.minimum.accumulate(short, axis=0)
        return np.maximum(missing.max(axis=0) - self.score.store_L, 0.0)

    def judged(self, own: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(S,) cost with a price on what is lacking, and whether nothing is."""
        made = self.pushed(own)
        lacks = self.lacks(made)
        return self.cost(made) + self.price * lacks / self.score.refill_L_s, lacks <= 1e-9 * self.score.store_L

    def best(self, seed: int, effort: float = 1.0) -> float:
        """The least cost found of times that the receiver bears, inf where none was met."""
        self.sample(COARSE)
        rng = np.random.default_rng(seed)
        n, reach = len(self.written), float(self.litres.sum() / self.score.refill_L_s)
        written = self.kept(self.written[:, None])
        spread = rng.choice([0.05, 0.3, 1.0], PEOPLE) * reach
        people = written + spread * rng.uniform(-0.5, 1.0, (n, PEOPLE)) * (rng.random((n, PEOPLE)) < 0.7)
        people[:, :1] = written
        worth = self.judged(people)[0]
        for _ in range(int(ROUNDS * effort)):
            leader = people[:, rng.permutation(np.argsort(worth)[: PEOPLE // 6])[rng.integers(0, PEOPLE // 6, PEOPLE)]]
            one, other = people[:, rng.integers(0, PEOPLE, PEOPLE)], people[:, rng.integers(0, PEOPLE, PEOPLE)]
            far = rng.uniform(0.3, 0.9, PEOPLE)
            trial = people + far * (leader - people) + far * (one - other)
            trial = np.where(rng.random((n, PEOPLE)) < rng.choice([0.3, 0.9], PEOPLE), trial, people)
            # What is as written costs nothing: some trials go all the way.
            trial = np.where(rng.random((n, PEOPLE)) < 0.05, written, trial)
            then = self.judged(trial)[0]
            better = then < worth
            people[:, better], worth[better] = trial[:, better], then[better]
        self.sample(FINE)
        return self._closed_in(people[:, np.argsort(worth)[:4]], rng, effort)

    def _closed_in(self, several: np.ndarray, rng: np.random.Generator, effort: float) -> float:
        """From several good choices along random directions, in steps that shrink where they find nothing better."""
        known, n, tries = np.inf, len(several), 32
        for here in several.T:
            worth, step = np.inf, 0.2
            for _ in range(int(LINES * effort) // tries):
                way = rng.normal(size=(n, tries)) * (rng.random((n, tries)) < rng.choice([1.5 / n, 0.5, 1.0], tries))
                # Together as well as alone: whole groups that move by the same keep their order and their distances.
                group = rng.random((n, tries)) < 0.5
                way = np.where(rng.random(tries) < 0.4, group * rng.normal(size=tries), way)
                trial = here[:, None] + way * step * rng.choice([1.0, 0.1, 0.01], tries)
                then, bears = self.judged(trial)
                known = min(known, then[bears].min(initial=np.inf))
                at = int(then.argmin())
                if then[at] < worth:
                    here, worth, step = (
                        self.kept(self.pushed(trial[:, at : at + 1]))[:, 0],
                        float(then[at]),
                        min(step * 1.5, 0.5),
                    )
                else:
                    step = max(step * 0.7, 1e-6)
        return known
