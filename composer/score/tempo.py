"""Counts, seconds and bars of a score: tempo and meter as arrays, every conversion exact and with an exact inverse."""

from collections.abc import Iterable
from dataclasses import dataclass, replace
from math import expm1, log1p

import numpy as np
from numpy.typing import ArrayLike, NDArray

from composer.faults import Fault, Faults, Where
from composer.score.bounds import RANGES
from composer.score.checks import DEFAULT_METER
from composer.score.model import Meter, Place, Score, Span, Tempo

Array = NDArray[np.float64]

DEFAULT_RATE = 60
"""Counts a minute where the score names no tempo."""


@dataclass(frozen=True, slots=True, eq=False)
class TempoMap:
    """S stretches of tempo and M stretches of meter; counts, seconds and bars all run from 0 at the score's start.

    In a stretch the rate is linear in counts, rate + slope * (count - its start), so with dt = dc / rate its seconds are
    log(1 + slope x / rate) / slope. Before the start the first rate holds, after the last stretch its own.

    tempo_count, tempo_s, rate, slope: (S,) where a stretch starts in counts and in s, counts/s there, 1/s
    meter_count, meter_bar, bar_counts: (M,) where a meter starts in counts and in bars, counts in its bars
    """

    tempo_count: Array
    tempo_s: Array
    rate: Array
    slope: Array
    meter_count: Array
    meter_bar: Array
    bar_counts: Array

    def seconds(self, counts: ArrayLike) -> Array:
        """Seconds from the score's start at `counts`, any shape."""
        counts = np.asarray(counts, dtype=float)
        if len(self.rate) == 1 and self.slope[0] == 0.0:
            return self.tempo_s[0] + (counts - self.tempo_count[0]) / self.rate[0]
        k = _stretch(self.tempo_count, counts)
        gone = counts - self.tempo_count[k]
        took = gone / self.rate[k]
        bend = self.slope[k] * gone / self.rate[k]
        if np.count_nonzero(bends := (bend != 0.0) & (gone > 0.0)):
            took = np.where(bends, took * _over(np.log1p, np.where(bends, bend, 0.0)), took)
        return self.tempo_s[k] + took

    def counts(self, seconds: ArrayLike) -> Array:
        """Counts at `seconds`, any shape: the inverse of `seconds`."""
        seconds = np.asarray(seconds, dtype=float)
        if len(self.rate) == 1 and self.slope[0] == 0.0:
            return self.tempo_count[0] + (seconds - self.tempo_s[0]) * self.rate[0]
        k = _stretch(self.tempo_s, seconds)
        gone = seconds - self.tempo_s[k]
        bend = np.where(gone > 0.0, self.slope[k] * gone, 0.0)
        return self.tempo_count[k] + self.rate[k] * gone * _over(np.expm1, bend)

    def bars(self, counts: ArrayLike) -> Array:
        """Bars gone at `counts`, with the part of the bar under way; any shape."""
        counts = np.asarray(counts, dtype=float)
        k = _stretch(self.meter_count, counts)
        return self.meter_bar[k] + (counts - self.meter_count[k]) / self.bar_counts[k]

    def counts_of_bars(self, bars: ArrayLike) -> Array:
        """Counts when `bars` bars have gone: the inverse of `bars`."""
        bars = np.asarray(bars, dtype=float)
        k = _stretch(self.meter_bar, bars)
        return self.meter_count[k] + (bars - self.meter_bar[k]) * self.bar_counts[k]

    def shifted(self, counts: ArrayLike, by: ArrayLike, unit: str) -> Array:
        """Counts of the places `by` later than `counts`, in `unit` "counts", "s" or "bars"; shapes broadcast."""
        if unit == "s":
            return self.counts(self.seconds(counts) + by)
        if unit == "bars":
            return self.counts_of_bars(self.bars(counts) + by)
        return np.asarray(counts, dtype=float) + by

    def counts_of(self, place: Place) -> float:
        """Counts of a place. Raises Faults where its bar has no such count."""
        if place.seconds is not None:
            return float(self.counts(float(place.seconds)))
        k = max(int(self.meter_bar.searchsorted(place.bar - 1, side="right")) - 1, 0)
        counts = float(self.bar_counts[k])
        over, under = place.count.numerator, place.count.denominator  # in whole numbers: exact, and quick
        if place.bar < 1 or not under <= over < (int(counts) + 1) * under:
            raise Faults([_wrong_place(place, int(counts))])
        return float(self.meter_count[k]) + (place.bar - 1 - float(self.meter_bar[k])) * counts + (over - under) / under

    def say_place(self, seconds: float) -> str:
        """The place at `seconds` as a person writes it, "2:1" or "5:2.5", to a thousandth of a count."""
        counts = max(0.0, float(self.counts(seconds)))
        # Rounded first: 5:0.9999999 is said as 5:1, and the last thousandth of a bar as the next bar's first count.
        thousandths = round(counts * 1000.0) / 1000.0
        bar = int(np.floor(float(self.bars(thousandths)) + 1e-9))
        return f"{bar + 1}:{_plain(thousandths - float(self.counts_of_bars(bar)) + 1.0)}"


def _stretch(starts: Array, at: Array) -> NDArray[np.int64]:
    if len(starts) == 1:
        return np.zeros(at.shape, dtype=np.int64)
    return np.maximum(starts.searchsorted(at, side="right") - 1, 0)


def _over(function: np.ufunc, bend: Array) -> Array:
    """function(bend) / bend, and its limit 1 at 0."""
    return np.divide(function(bend), bend, out=np.ones_like(bend), where=bend != 0.0)


def _plain(value: float) -> str:
    return f"{value:.3f}".rstrip("0").rstrip(".")


def tempo_map(score: Score) -> TempoMap:
    """The tempo map of a score. Raises Faults for changes that contradict one another."""
    faults: list[Fault] = []
    whole = _tempi(score, _meters(score.meters, faults), faults)
    if faults:
        raise Faults(with_text(faults, score))
    return whole


def with_text(faults: Iterable[Fault], score: Score) -> list[Fault]:
    """The same faults, each with the line of the score that it points at."""
    told = []
    for fault in faults:
        at, lines = fault.where, score.lines.get(fault.where.file, ())
        text = lines[at.line - 1] if 0 < at.line <= len(lines) else ""
        told.append(replace(fault, where=replace(at, text=at.text or text)))
    return told


def fault_at(span: Span, found: str, expected: str = "", hint: str = "") -> Fault:
    """A fault at a span of a score; `with_text` adds the line's text."""
    return Fault(Where(span.file, span.line, span.column, max(1, span.end - span.column)), found, expected, hint)


def _wrong_place(place: Place, counts: int) -> Fault:
    count = float(place.count)
    return fault_at(place.span, f"bar {place.bar} has no count {count:g}", f"a count from 1 to before {counts + 1} in this bar")


def _meters(meters: tuple[Meter, ...], faults: list[Fault]) -> tuple[Array, Array, Array]:
    """Starts in counts and bars, and counts in a bar, of each stretch of one meter."""
    stretches: dict[int, Meter] = {}
    for meter in meters:
        bar = 0
        if meter.at is not None:
            if meter.at.seconds is not None or meter.at.count != 1:
                faults.append(fault_at(meter.at.span, "a meter changes inside a bar", "the first count of a bar, such as 9:1"))
                continue
            bar = meter.at.bar - 1
        if bar in stretches:
            earlier = stretches[bar].span.line
            faults.append(fault_at(meter.span, f"bar {bar + 1} has two meters, the other on line {earlier}", "one"))
        elif meter.counts < 1:
            faults.append(fault_at(meter.span, f"a meter of {meter.counts} counts", "at least 1 count in a bar"))
        else:
            stretches[bar] = meter
    starts, sizes = [0], [DEFAULT_METER]
    for bar in sorted(stretches):
        if bar == 0:
            sizes[0] = stretches[0].counts
        else:
            starts.append(bar)
            sizes.append(stretches[bar].counts)
    bars, counts, begins = np.array(starts, dtype=float), np.array(sizes, dtype=float), np.zeros(len(starts))
    ((bars[1:] - bars[:-1]) * counts[:-1]).cumsum(out=begins[1:])
    return begins, bars, counts


def _tempi(score: Score, meter: tuple[Array, Array, Array], faults: list[Fault]) -> TempoMap:
    """The stretches of tempo, changes taken in the order in which they happen.

    A place in seconds can be put among the others only when all before it are known, so the two kinds are merged.
    """
    starts, seconds, rates, slopes = [0.0], [0.0], [DEFAULT_RATE / 60.0], [0.0]

    # Only the last stretch is asked, as changes come in order; its numbers one by one, as TempoMap has them for arrays.
    def seconds_at(count: float) -> float:
        gone = count - starts[-1]
        bend = slopes[-1] * gone / rates[-1] if gone > 0.0 else 0.0
        return seconds[-1] + gone / rates[-1] * (log1p(bend) / bend if bend else 1.0)

    def counts_at(at_s: float) -> float:
        gone = at_s - seconds[-1]
        bend = slopes[-1] * gone if gone > 0.0 else 0.0
        return starts[-1] + rates[-1] * gone * (expm1(bend) / bend if bend else 1.0)

    def add(count: float, rate: float, slope: float) -> None:
        if count > starts[-1]:
            seconds.append(seconds_at(count))
            starts.append(count)
            rates.append(rate)
            slopes.append(slope)
        else:
            rates[-1], slopes[-1] = rate, slope

    bars = TempoMap(*(np.array(part) for part in (starts, seconds, rates, slopes)), *meter)
    musical, timed = _in_order(score.tempi, bars, faults)
    ends, last_count, last = 0.0, -1.0, None
    while musical or timed:
        if timed and (not musical or counts_at(timed[0][0]) <= musical[0][0]):
            at_s, tempo = timed.pop(0)
            count = counts_at(at_s)
        else:
            count, tempo = musical.pop(0)
        if last is not None and (count < ends or count == last_count):
            faults.append(
                fault_at(
                    tempo.span, f"this tempo starts before the one on line {last.span.line} is done", "one tempo at a time"
                )
            )
            continue
        last, ends, last_count = tempo, count, count
        rate = float(tempo.rate) / 60.0
        if tempo.to is None or tempo.until is None:
            add(count, rate, 0.0)
            continue
        try:
            until = bars.counts_of(tempo.until) if tempo.until.seconds is None else None
        except Faults as wrong:
            faults.extend(wrong.faults)
            continue
        to = float(tempo.to) / 60.0
        if until is None:
            until = _end_of_timed_ramp(float(tempo.until.seconds), seconds_at(count), count, rate, to)
        if not until > count:
            faults.append(fault_at(tempo.until.span, "this tempo ends before it starts", "a place after its start"))
            continue
        add(count, rate, (to - rate) / (until - count))
        add(until, to, 0.0)
        ends = until
    return TempoMap(*(np.array(part) for part in (starts, seconds, rates, slopes)), *meter)


def _end_of_timed_ramp(end_s: float, start_s: float, count: float, rate: float, to: float) -> float:
    """The count at which a ramp ends that is given its end in seconds: counts = T (to - rate) / log(to / rate)."""
    if end_s <= start_s:
        return count
    mean = rate if to == rate else (to - rate) / float(np.log(to / rate))
    return count + (end_s - start_s) * mean


def _in_order(
    tempi: tuple[Tempo, ...], meters: TempoMap, faults: list[Fault]
) -> tuple[list[tuple[float, Tempo]], list[tuple[float, Tempo]]]:
    """Changes at places in bars (by counts) and at places in seconds, each in order."""
    musical: list[tuple[float, Tempo]] = []
    timed: list[tuple[float, Tempo]] = []
    for tempo in tempi:
        for rate in (tempo.rate, tempo.to):
            if rate is not None and not RANGES["tempo"].holds(rate):
                found = f"a tempo of {float(rate):g} counts a minute"
                faults.append(fault_at(tempo.span, found, f"counts a minute, {RANGES['tempo'].told}"))
                break
        else:
            try:
                if tempo.at is not None and tempo.at.seconds is not None:
                    timed.append((float(tempo.at.seconds), tempo))
                else:
                    musical.append((0.0 if tempo.at is None else meters.counts_of(tempo.at), tempo))
            except Faults as wrong:
                faults.extend(wrong.faults)
    musical.sort(key=lambda change: change[0])
    timed.sort(key=lambda change: change[0])
    return musical, timed
