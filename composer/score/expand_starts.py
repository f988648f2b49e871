"""Who starts what when: every entry of a score for every fiber and repeat, as arrays."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from composer.faults import Fault, Faults
from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.expand_lines import phrase_length
from composer.score.model import Duration, Entry, Repeat, Score, Section
from composer.score.tempo import TempoMap, fault_at

Array = NDArray[np.float64]

MOST_FAULTS = 100
"""Faults found in expansion before no more are looked for: a person mends the first ones first."""


@dataclass(frozen=True, slots=True, eq=False)
class Starts:
    """N instances of phrases: one fiber playing one phrase once.

    fiber, variant, entry: (N,) int; `variant` and `entry` index `variants` (phrase name, whether backwards) and `entries`
    count: (N,) where it starts, in counts; stretch, scale: (N,); added: (N,) whether it is a layer of its own
    """

    fiber: NDArray[np.int64]
    variant: NDArray[np.int64]
    entry: NDArray[np.int64]
    count: Array
    stretch: Array
    scale: Array
    added: NDArray[np.bool_]
    variants: list[tuple[str, bool]]
    entries: list[Entry]


def starts_of(score: Score, rig: Rig, selector: Selector, tempo: TempoMap, faults: list[Fault]) -> Starts:
    """Every instance that a score asks for, its names and bounds having been checked. Faults are added to `faults`;
    entries with a fault are left out."""
    work = _Work(score, rig, selector, tempo, faults)
    for section in score.sections:
        work.section(section)
    sizes = np.array([len(part) for part in work.counts], dtype=np.int64)
    entry = np.array(work.numbers, dtype=np.int64).repeat(sizes)
    per_entry = np.array([(float(e.stretch), float(e.scale), e.add) for e in work.entries]).reshape(-1, 3)
    return Starts(
        fiber=_end_to_end(work.fibers, np.int64),
        variant=np.array(work.variant, dtype=np.int64).repeat(sizes),
        entry=entry,
        count=_end_to_end(work.counts, np.float64),
        stretch=per_entry[entry, 0],
        scale=per_entry[entry, 1],
        added=per_entry[entry, 2] != 0.0,
        variants=list(work.variants),
        entries=work.entries,
    )


def _end_to_end(parts: list[NDArray], kind: type) -> NDArray:
    return np.concatenate(parts) if parts else np.empty(0, dtype=kind)


GOLDEN = np.uint64(0x9E3779B97F4A7C15)


def scattered(seed: int, fibers: NDArray[np.int64]) -> Array:
    """A number in [-1, 1) for each fiber index, the same on any machine: SplitMix64 (Steele, Lea and Flood 2014)."""
    seeded = mixed(np.array([seed % 2**64], dtype=np.uint64) + GOLDEN)
    drawn = mixed(seeded + GOLDEN * (fibers.astype(np.uint64) + np.uint64(1)))
    return (drawn >> np.uint64(11)).astype(float) * 2.0**-52 - 1.0


def mixed(z: NDArray[np.uint64]) -> NDArray[np.uint64]:
    """SplitMix64's output for states, any shape."""
    z = (z ^ (z >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    z = (z ^ (z >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    return z ^ (z >> np.uint64(31))


class _Work:
    """The lists that grow while entries are read one by one."""

    def __init__(self, score: Score, rig: Rig, selector: Selector, tempo: TempoMap, faults: list[Fault]):
        self.score, self.rig, self.selector, self.tempo, self.faults = score, rig, selector, tempo, faults
        self.fibers: list[NDArray[np.int64]] = []
        self.counts: list[Array] = []
        self.variant: list[int] = []
        self.numbers: list[int] = []
        self.entries: list[Entry] = []
        self.variants: dict[tuple[str, bool], int] = {}
        self.known: dict[tuple[str, ...], NDArray[np.int64]] = {}

    def section(self, section: Section) -> None:
        """All entries of a section, in all its repeats."""
        try:
            start = self.tempo.counts_of(section.at)
        except Faults as wrong:
            self.faults.extend(wrong.faults)
            return
        repeat = section.repeat
        if repeat is not None and repeat.times > 1 and repeat.every is None:
            self.faults.append(fault_at(repeat.span, f"section '{section.name}' is repeated", "'every' and how far apart"))
            return
        starts = self._repeated(np.array([start]), repeat, None)
        for entry in section.entries:
            if len(self.faults) > MOST_FAULTS:
                return
            try:
                self._entry(entry, section, starts)
            except Faults as wrong:
                self.faults.extend(wrong.faults)

    def _entry(self, entry: Entry, section: Section, starts: Array) -> None:
        phrase = self.score.phrases[entry.phrase.text]
        fibers = self._fibers(entry)
        if entry.at is not None:
            every = None if section.repeat is None else section.repeat
            starts = self._repeated(np.array([self.tempo.counts_of(entry.at)]), every, None)
        elif entry.after is not None:
            starts = self._shifted(starts, entry.after)
        if (repeat := entry.repeat) is not None and repeat.times > 1:
            length = None if repeat.every else _times(phrase_length(phrase), entry.stretch)
            starts = self._repeated(starts, repeat, length)
        counts = starts[:, None].repeat(len(fibers), axis=1)
        if entry.canon is not None:
            rank = ranks(entry.canon.origin, len(fibers))
            counts = self.tempo.shifted(counts, rank * float(entry.canon.delay.value), entry.canon.delay.unit)
        if entry.scatter is not None:
            off = scattered(entry.scatter.seed, fibers) * float(entry.scatter.within.value)
            counts = self.tempo.shifted(counts, off, entry.scatter.within.unit)
        if entry.ripple is not None:
            hangs = np.array([self.rig.fibers[fiber].at_m[entry.ripple.axis] for fiber in fibers.tolist()], dtype=float)
            along = hangs / float(entry.ripple.speed)
            counts = self.tempo.shifted(counts, along - along.min(), "s")
        self._not_before_the_start(entry, fibers, counts)
        playing = fibers
        if entry.mirror:
            playing = np.array([self.rig.fibers[fiber].mirror for fiber in fibers.tolist()], dtype=np.int64)
        self.numbers.append(len(self.entries))
        self.entries.append(entry)
        self.variant.append(self.variants.setdefault((phrase.name, entry.retrograde), len(self.variants)))
        repeats = counts.size // max(len(playing), 1)
        self.fibers.append(playing[None, :].repeat(repeats, axis=0).ravel())
        self.counts.append(np.maximum(counts, 0.0).ravel())

    def _shifted(self, counts: Array, by: Duration, times: Array | float = 1.0) -> Array:
        return self.tempo.shifted(counts, float(by.value) * np.asarray(times), by.unit)

    def _repeated(self, starts: Array, repeat: Repeat | None, length: Duration | None) -> Array:
        """The starts of all repeats, `length` apart where the repeat does not say."""
        if repeat is None or repeat.times == 1:
            return starts
        every = repeat.every or length
        if every is None or every.value == 0:
            raise Faults([fault_at(repeat.span, "the repeats start at one instant", "'every' and how far apart")])
        return self._shifted(starts[:, None], every, np.arange(repeat.times)[None, :]).ravel()

    def _fibers(self, entry: Entry) -> NDArray[np.int64]:
        """The fibers named, each once, in the rig's order."""
        texts = tuple(name.text for name in entry.fibers)
        if texts not in self.known:
            found = {index for text in texts for index in self.selector.resolve(text)}
            self.known[texts] = np.array(sorted(found), dtype=np.int64)
        return self.known[texts]

    def _not_before_the_start(self, entry: Entry, fibers: NDArray[np.int64], counts: Array) -> None:
        if counts.min(initial=0.0) < -1e-9:
            early = np.argwhere(counts < -1e-9)
            who = self.rig.fibers[int(fibers[early[0, 1]])].name
            by = -float(self.tempo.seconds(counts[tuple(early[0])]))
            raise Faults(
                [
                    fault_at(
                        entry.span,
                        f"'{who}' would start {by:.3g} s before the score does",
                        "starts at 1:1 or later",
                        "start the entry later, or scatter it less",
                    )
                ]
            )


def _times(duration: Duration | None, stretch: Fraction) -> Duration | None:
    return None if duration is None else Duration(duration.value * stretch, duration.unit, duration.span)


def ranks(origin: str, count: int) -> Array:
    """How many delays after the first each of `count` fibers starts in a canon from "start", "end", "middle" or "edges"."""
    places = np.arange(count, dtype=float)
    if origin == "end":
        return places[::-1]
    if origin == "middle":
        away = np.abs(places - (count - 1) / 2)
        return away - away.min()
    if origin == "edges":
        return np.minimum(places, places[::-1])
    return places
