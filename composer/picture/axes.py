"""Where ticks and labels go along an axis, so that they never crowd: bars and counts, seconds, values."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.picture.bars import Bars

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Tick:
    """A mark at `at` (seconds, or a value), `label` "" for none, `strong` for the first rank."""

    at: float
    label: str
    strong: bool


def bar_ticks(tempo: Bars, from_s: float, to_s: float, width: float, label_px: float, count_px: float) -> tuple[Tick, ...]:
    """Ticks of bars, and of counts where there is room, over `width` pixels from `from_s` to `to_s`.

    Bars are labelled by 1, 2, 4, 8 ... (bar 1 always among them) so that labels stand `label_px` apart at least; bars between
    are ticks alone where they stand 3 pixels apart at least, counts where they stand `count_px` apart at least, labelled
    where there is room.
    """
    if to_s <= from_s:
        return ()
    first = int(np.floor(float(tempo.bars(tempo.counts(from_s))) + 1e-9))
    last = int(np.ceil(float(tempo.bars(tempo.counts(to_s))) - 1e-9))
    per_px = (to_s - from_s) / width
    step = 1
    while step < 1 << 40 and _narrowest(tempo, first, last, step) < label_px * per_px:
        step *= 2
    # Only marks that can be told apart are worked out, however many bars there are.
    fine = step
    while fine > 1 and _narrowest(tempo, first, last, fine // 2) >= 3.0 * per_px:
        fine //= 2
    bars = np.arange(first - first % fine, last + 1, fine)
    seconds = tempo.seconds(tempo.counts_of_bars(bars))
    ticks = [
        Tick(float(at), str(bar + 1) if bar % step == 0 else "", True)
        for bar, at in zip(bars, seconds, strict=True)
        if from_s - 1e-9 <= at <= to_s + 1e-9
    ]
    if step == 1 and fine == 1:
        ticks += _count_ticks(tempo, bars, from_s, to_s, per_px, label_px, count_px)
    return tuple(ticks)


def _count_ticks(
    tempo: Bars, bars: NDArray[np.int64], from_s: float, to_s: float, per_px: float, label_px: float, count_px: float
) -> list[Tick]:
    ticks = []
    for bar in bars:
        start, end = tempo.counts_of_bars(np.array([bar, bar + 1]))
        counts = np.arange(start + 1.0, end - 1e-9)
        seconds = tempo.seconds(np.append(counts, end))
        if not len(counts) or np.diff(seconds, prepend=tempo.seconds(start)).min() < count_px * per_px:
            continue
        room = np.diff(seconds).min(initial=np.inf) >= label_px * per_px
        for number, at in enumerate(seconds[:-1], 2):
            if from_s <= at <= to_s:
                ticks.append(Tick(float(at), f"{bar + 1}:{number}" if room else "", False))
    return ticks


def _narrowest(tempo: Bars, first: int, last: int, step: int) -> float:
    """The shortest time in s that `step` bars on end take, between two bars; exact for few bars, sampled for very many."""
    starts = np.arange(first - first % step, max(last, first + 1), step)
    if len(starts) > 4096:
        starts = starts[np.linspace(0, len(starts) - 1, 4096).astype(int)]
    return float(np.min(tempo.seconds(tempo.counts_of_bars(starts + step)) - tempo.seconds(tempo.counts_of_bars(starts))))


def second_ticks(from_s: float, to_s: float, width: float, label_px: float) -> tuple[Tick, ...]:
    """Ticks of seconds at round numbers, labelled "1:05" from a minute on and "12.5" below, `label_px` apart at least."""
    if to_s <= from_s:
        return ()
    least = (to_s - from_s) / width * label_px
    step = next((s for s in _ROUND_SECONDS if s >= least), None)
    if step is None:
        step = 3600.0 * 10 ** np.ceil(np.log10(least / 3600.0))
    first, last = int(np.ceil(from_s / step - 1e-9)), int(np.floor(to_s / step + 1e-9))
    digits = max(0, int(np.ceil(-np.log10(step) - 1e-9))) if step < 1 else 0
    return tuple(Tick(n * step, say_seconds(n * step, digits), True) for n in range(first, last + 1))


_ROUND_SECONDS = (0.001, 0.002, 0.005, 0.01, 0.02, 0.05, 0.1, 0.2, 0.5, 1, 2, 5, 10, 15, 30, 60, 120, 300, 600, 1200, 3600)


def grid_lines(tempo: Bars, grid: float, from_s: float, to_s: float, per_px: float, least_px: float) -> list[float]:
    """The instants, in s, of a grid of counts that are drawn between two: every second, fourth or so on where the lines would
    lie closer than `least_px`; the first is just before `from_s`. per_px: seconds a pixel"""
    counts = [float(tempo.counts(at)) for at in (from_s, to_s)]
    step = grid
    while (counts[1] - counts[0]) / step * least_px * per_px > to_s - from_s:
        step *= 2.0
    first, last = (int(np.floor(count / step)) for count in counts)
    return tempo.seconds(np.arange(first, last + 1) * step).tolist()


def say_seconds(seconds: float, digits: int = 0) -> str:
    """A time as read on an axis: "12.5 s" below a minute, "3:05" from there on."""
    if seconds < 60:
        return f"{seconds:.{digits}f} s"
    minutes, rest = divmod(round(seconds, digits), 60)
    return f"{int(minutes)}:{rest:0{3 + digits if digits else 2}.{digits}f}"


def value_ticks(low: float, high: float, most: int) -> Array:
    """Round values between `low` and `high`, at most `most` of them."""
    span = high - low
    if not span > 0 or most < 1:
        return np.zeros(0)
    for step in (10.0**power * digit for power in range(int(np.floor(np.log10(span))) - 2, 20) for digit in (1, 2, 5)):
        values = np.arange(np.ceil(low / step - 1e-9), np.floor(high / step + 1e-9) + 1) * step + 0.0
        if len(values) <= most:
            return values
    return np.zeros(0)
