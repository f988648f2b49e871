"""A score's meters, tempi and cues as those of a MIDI file, so that the music can follow the score."""

import numpy as np
from numpy.typing import NDArray

from composer.faults import fault
from composer.score.model import Score
from composer.score.tempo import TempoMap
from player.inputs.file_to_score import WAITS
from player.inputs.midi_file import DIVISION, Times

Array = NDArray[np.float64]

STEP_S = 0.00025
"""How far the steps of a ramp may be from it within one step; at their ends they are not."""

FINEST, COARSEST = 1.0 / 64.0, 4.0
"""Counts that a step lasts."""

MOST_STEPS = 40_000
SLOWEST = (1 << 24) - 1
"""Microseconds of a quarter note: a MIDI file has three bytes for them."""


def times_of(score: Score, tempo: TempoMap) -> Times:
    """The times of a MIDI file. Raises `Faults` where the file cannot have them."""
    notes = {meter.at.bar - 1 if meter.at is not None else 0: meter.note for meter in score.meters}
    note = np.array([notes.get(int(bar), 4) for bar in tempo.meter_bar], dtype=float)
    starts = np.concatenate([[0.0], np.cumsum(np.diff(tempo.meter_count) * 4.0 * DIVISION / note[:-1])])
    ticks = _Ticks(tempo.meter_count, starts, 4.0 * DIVISION / note)
    rows = zip(starts, tempo.bar_counts, note, strict=True)
    meters = tuple((round(float(tick)), int(counts), int(value)) for tick, counts, value in rows)
    markers = sorted((ticks.at(tempo.counts_of(cue.at)), cue.name + (WAITS if cue.wait else "")) for cue in score.cues)
    return Times(DIVISION, meters, _tempi(score, tempo, ticks), tuple(markers))


class _Ticks:
    """Ticks of counts: a count is as many as the note value of its meter has."""

    def __init__(self, counts: Array, starts: Array, each: Array):
        self.counts, self.starts, self.each = counts, starts, each

    def at(self, count: float) -> int:
        """The nearest tick."""
        k = max(0, int(np.searchsorted(self.counts, count, side="right")) - 1)
        return round(float(self.starts[k] + (count - self.counts[k]) * self.each[k]))

    def count(self, tick: int) -> float:
        """The count of a tick."""
        k = max(0, int(np.searchsorted(self.starts, tick, side="right")) - 1)
        return float(self.counts[k] + (tick - self.starts[k]) / self.each[k])


def _tempi(score: Score, tempo: TempoMap, ticks: _Ticks) -> tuple[tuple[int, int], ...]:
    """Every change of tempo: one for each stretch and for each meter of other notes, many for a ramp."""
    bounds = sorted({float(count) for count in (*tempo.tempo_count, *tempo.meter_count) if count >= 0.0} | {0.0})
    out: list[tuple[int, int]] = []
    for begin, end in zip(bounds, [*bounds[1:], None], strict=True):
        k = max(0, int(np.searchsorted(tempo.tempo_count, begin, side="right")) - 1)
        rate, slope = float(tempo.rate[k]), float(tempo.slope[k])
        first = ticks.at(begin)
        if slope == 0.0 or end is None:
            j = max(0, int(np.searchsorted(ticks.counts, begin, side="right")) - 1)
            out.append((first, _micros(score, DIVISION / float(ticks.each[j]) / rate)))
            continue
        rate += slope * (begin - float(tempo.tempo_count[k]))
        out += _steps(score, tempo, ticks, first, ticks.at(end), _step(rate, rate + slope * (end - begin), slope))
        if len(out) > MOST_STEPS:
            raise fault(score.file, f"the score's ramps take more than {MOST_STEPS} steps of tempo in a MIDI file")
    kept: list[tuple[int, int]] = []
    for tick, micros in dict(out).items():
        if not kept or kept[-1][1] != micros:
            kept.append((tick, micros))
    return tuple(kept)


def _step(rate: float, to: float, slope: float) -> float:
    """Counts of a step: the longest, by halves, that keeps within STEP_S of the ramp. Rates in counts/s."""
    most = (8.0 * STEP_S / abs(slope)) ** 0.5 * min(rate, to)
    return float(min(COARSEST, max(FINEST, 2.0 ** np.floor(np.log2(most)))))


def _steps(score: Score, tempo: TempoMap, ticks: _Ticks, first: int, last: int, step: float) -> list[tuple[int, int]]:
    """The steps of a ramp, each as long as the ramp takes for it; what a rounding loses, the next step makes up for."""
    each = float(ticks.each[max(0, int(np.searchsorted(ticks.starts, first, side="right")) - 1)])
    width = max(1, round(step * each))
    if (last - first) / width > MOST_STEPS:
        raise fault(score.file, f"a ramp of tempo takes more than {MOST_STEPS} steps in a MIDI file")
    edges = [*range(first, last, width), last]
    seconds = tempo.seconds([ticks.count(edge) for edge in edges])
    out, written_s = [], float(seconds[0])
    for k in range(len(edges) - 1):
        quarters = (edges[k + 1] - edges[k]) / DIVISION
        micros = _micros(score, (float(seconds[k + 1]) - written_s) / quarters)
        written_s += micros * quarters * 1e-6
        out.append((edges[k], micros))
    return out


def _micros(score: Score, quarter_s: float) -> int:
    micros = round(quarter_s * 1e6)
    if not 1 <= micros <= SLOWEST:
        found = f"a tempo of {60.0 / quarter_s:.4g} quarter notes a minute"
        raise fault(score.file, found, "more than 3.58, which is the slowest that a MIDI file can have")
    return micros
