"""A MIDI file's times as statements of a score: meters, tempi with their ramps, markers as cues."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from composer.faults import fault
from composer.score.bounds import RANGES
from player.inputs.bars import Bars, bars_of
from player.inputs.midi_file import MOST_NAME, Times

Array = NDArray[np.float64]

WAITS = " (wait)"
"""What a marker's text ends with where the cue waits."""

DEFAULT_MICROS = 500_000
"""Microseconds of a quarter note where a file says nothing."""

FEWEST_STEPS = 4
"""Steps of tempo in a row that may be a ramp."""

LONGEST_STEP = 4
"""Counts that a step of a ramp lasts at most."""

RAMP_S = 0.0003
"""How far a ramp may be from its steps at any of their ends."""


@dataclass(frozen=True, slots=True)
class Step:
    """A tempo from a tick on: counts a minute, exactly, and microseconds of a quarter note."""

    tick: int
    rate: Fraction
    micros: int
    note: int


def score_of(times: Times, file: str) -> str:
    """The statements. Raises `Faults` for what a score cannot have."""
    bars = bars_of(times, file)
    lines = [f"# from {file.replace(chr(92), '/').rsplit('/', 1)[-1]}"]
    for stretch in bars.stretches:
        lines.append(f"meter   {stretch.counts}/{stretch.note}" + (f" at {stretch.bar + 1}:1" if stretch.bar else ""))
    last = max((row[0] for rows in (times.meters, times.tempi, times.markers) for row in rows), default=0)
    if not RANGES["bar"].holds(Fraction(bars.bar_of(last))):
        raise fault(file, f"bar {bars.bar_of(last)}", f"bars, {RANGES['bar'].told}")
    lines += _tempi(_steps(times, bars, file), bars)
    lines += _cues(times, bars)
    return "\n".join(lines) + "\n"


def _steps(times: Times, bars: Bars, file: str) -> list[Step]:
    """Every change of tempo in counts a minute: a meter of other notes is one too."""
    changes = {0: DEFAULT_MICROS} | dict(times.tempi)
    micros = DEFAULT_MICROS
    steps: list[Step] = []
    for tick in sorted(changes.keys() | {int(stretch.tick) for stretch in bars.stretches}):
        micros = changes.get(tick, micros)
        note = bars.at(tick).note
        rate = Fraction(60_000_000 * note, 4 * micros)
        if not RANGES["tempo"].holds(rate):
            found = f"a tempo of {float(rate):g} counts a minute at {bars.place(tick)}"
            raise fault(file, found, f"counts a minute, {RANGES['tempo'].told}")
        steps.append(Step(tick, rate, micros, note))
    return steps


def _tempi(steps: list[Step], bars: Bars) -> list[str]:
    lines, at, running, no_ramp_until = [], 0, "", 0
    while at < len(steps):
        end = _ramp_end(steps, at) if at >= no_ramp_until else at
        ramp = _ramp(steps[at : end + 1], bars) if end > at else None
        no_ramp_until = max(no_ramp_until, end)
        if ramp is not None:
            lines.append(f"tempo   {ramp[0]} to {ramp[1]} from {bars.place(steps[at].tick)} to {bars.place(steps[end].tick)}")
            running, at = ramp[1], end
            continue
        said = _rate(steps[at])
        if said != running:
            lines.append(f"tempo   {said}" + (f" at {bars.place(steps[at].tick)}" if steps[at].tick else ""))
        running, at = said, at + 1
    return lines


def _rate(step: Step) -> str:
    """Counts a minute with the fewest decimals that come back to the same microseconds."""
    for places in range(12):
        said = round(step.rate, places)
        if said and round(Fraction(60_000_000 * step.note, 4) / said) == step.micros:
            return _decimal(said, places)
    return _decimal(round(step.rate, 12), 12)


def _decimal(value: Fraction, places: int) -> str:
    text = f"{float(value):.{places}f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def _ramp_end(steps: list[Step], at: int) -> int:
    """The step at which a ramp that begins with step `at` would be over; `at` itself where none begins."""
    slope, end = 0.0, at
    while end + 2 < len(steps):
        first, second, third = steps[end : end + 3]
        if not first.note == second.note == third.note:
            break
        lengths = float(second.tick - first.tick), float(third.tick - second.tick)
        change = float(second.rate - first.rate)
        here = change / (0.5 * sum(lengths))
        # A microsecond of a quarter note is so much of a tempo; two tempi go into a slope.
        blur = 2.0 * float(first.rate) / first.micros / (0.5 * sum(lengths))
        if here == 0.0 or (slope and abs(here - slope) > 0.15 * abs(slope) + 2.0 * blur):
            break
        slope, end = here, end + 1
    # Slopes lie between steps: so many of them have one step more.
    return end + 1 if end - at + 1 >= FEWEST_STEPS else at


def _ramp(steps: list[Step], bars: Bars) -> tuple[str, str] | None:
    """The tempi at both ends of a ramp that lands where its steps do, in the roundest numbers that keep to it."""
    ticks_a_count = float(bars.at(steps[0].tick).count_ticks)
    counts = np.array([step.tick for step in steps], dtype=float) / ticks_a_count
    counts -= counts[0]
    lengths = np.diff(counts)
    if lengths.max() > LONGEST_STEP:
        return None
    rates = np.array([float(step.rate) for step in steps[:-1]])
    ends_s = np.cumsum(lengths * 60.0 / rates)
    slope, start = np.polyfit(counts[:-1] + 0.5 * lengths, rates, 1, w=np.sqrt(lengths))
    for places in range(7):
        first, last = round(float(start), places), round(float(start + slope * counts[-1]), places)
        if min(first, last) < 1.0 or max(first, last) > 1000.0 or first == last:
            continue
        if np.abs(_ramp_s(first, last, counts[1:] / counts[-1]) * counts[-1] - ends_s).max() <= RAMP_S:
            return _decimal(Fraction(first), places), _decimal(Fraction(last), places)
    return None


def _ramp_s(first: float, last: float, share: Array) -> Array:
    """Seconds, for each count of the ramp, until that share of it has gone; the tempo is linear in counts."""
    bend = (last - first) / first
    return 60.0 / first * np.log1p(bend * share) / bend


def _cues(times: Times, bars: Bars) -> list[str]:
    lines, taken = [], set()
    for number, (tick, text) in enumerate(times.markers, 1):
        plain = " ".join("".join(c if c.isprintable() else " " for c in text).replace('"', "'").split())
        wait = plain.endswith(WAITS.strip()) and plain != WAITS.strip()
        name = (plain[: -len(WAITS)] if wait else plain)[:MOST_NAME].strip() or f"marker {number}"
        own, more = name, 2
        while own in taken:
            own, more = f"{name} {more}", more + 1
        taken.add(own)
        lines.append(f'cue     "{own}" at {bars.place(tick)}' + (" wait" if wait else ""))
    return lines
