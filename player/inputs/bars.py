"""The bars of a MIDI file: places of ticks, and meters as a score can have them, which change at bars alone."""

from bisect import bisect_right
from dataclasses import dataclass
from fractions import Fraction

from composer.faults import fault
from composer.score.bounds import RANGES
from player.inputs.midi_file import Times

FINEST = 64


@dataclass(frozen=True, slots=True)
class Stretch:
    """Bars of one meter: the tick and the bar, from 0, where it begins, counts in a bar and the note value of a count."""

    tick: Fraction
    bar: int
    counts: int
    note: int
    division: int

    @property
    def count_ticks(self) -> Fraction:
        """Ticks of a count."""
        return Fraction(4 * self.division, self.note)

    @property
    def bar_ticks(self) -> Fraction:
        """Ticks of a bar."""
        return self.counts * self.count_ticks


@dataclass(frozen=True, slots=True)
class Bars:
    """All stretches of a file."""

    stretches: tuple[Stretch, ...]

    def at(self, tick: float | Fraction) -> Stretch:
        """The stretch that a tick lies in."""
        return self.stretches[max(0, bisect_right(self.stretches, tick, key=lambda stretch: stretch.tick) - 1)]

    def place(self, tick: int | Fraction) -> str:
        """The place of a tick as a score writes it, exactly."""
        stretch = self.at(tick)
        bars, rest = divmod(tick - stretch.tick, stretch.bar_ticks)
        return f"{stretch.bar + int(bars) + 1}:{_plain(rest / stretch.count_ticks + 1)}"

    def bar_of(self, tick: int) -> int:
        """The bar of a tick, from 1."""
        stretch = self.at(tick)
        return stretch.bar + int((tick - stretch.tick) // stretch.bar_ticks) + 1


def _plain(value: Fraction) -> str:
    """A number exactly, as a decimal where it has one of a few places."""
    if value.denominator == 1:
        return str(value.numerator)
    if 1000000 % value.denominator == 0:
        return f"{float(value):.6f}".rstrip("0")
    whole, part = divmod(value, 1)
    return f"{whole}+{part.numerator}/{part.denominator}"


def bars_of(times: Times, file: str) -> Bars:
    """The bars of a file. A meter that changes within a bar ends that bar there; raises `Faults` where no meter fits it."""
    changes = dict.fromkeys([0], (4, 4)) | {tick: (counts, note) for tick, counts, note in times.meters}
    stretches: list[Stretch] = []
    for tick in sorted(changes):
        counts, note = changes[tick]
        if not RANGES["counts"].holds(Fraction(counts)):
            raise fault(file, f"a meter of {counts}/{note}", f"counts in a bar, {RANGES['counts'].told}")
        if not stretches:
            stretches.append(Stretch(Fraction(0), 0, counts, note, times.division))
            continue
        last = stretches[-1]
        bars, rest = divmod(tick - last.tick, last.bar_ticks)
        bar = last.bar + int(bars)
        if rest:
            short = _short(last, bar, rest, file)
            if bars:
                stretches.append(short)
            else:
                stretches[-1] = short
            bar += 1
        if (stretches[-1].counts, stretches[-1].note) != (counts, note):
            stretches.append(Stretch(Fraction(tick), bar, counts, note, times.division))
    return Bars(tuple(stretches))


def _short(last: Stretch, bar: int, rest: Fraction, file: str) -> Stretch:
    """A bar of so many ticks, in the coarsest note values that measure it from those of the meter on."""
    note = last.note
    begin = last.tick + (bar - last.bar) * last.bar_ticks
    while note <= FINEST:
        counts = rest * note / (4 * last.division)
        if counts.denominator == 1 and RANGES["counts"].holds(counts):
            return Stretch(begin, bar, int(counts), note, last.division)
        note *= 2
    raise fault(
        file,
        f"the meter changes within bar {bar + 1}, after {float(rest / last.count_ticks):g} counts",
        "a change at a bar, or after whole notes down to a 64th",
    )
