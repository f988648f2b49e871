"""Whether what a bench measured can be true: time that goes on, sizes and units, enough of a swing."""

from collections.abc import Callable, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from composer.faults import Fault, Faults, Where
from composer.fit.bench import Bench

MOST_PRESSURE_KPA = 2000.0
LEAST_PRESSURE_KPA = -100.0
LEAST_SWING_KPA = 10.0
MOST_STRAIN = 5.0
LEAST_STRAIN = -0.1
LEAST_MOVED = 0.002
MOST_FORCE_N = 1e5
MOST_TIME_S = 1e6
Place = Callable[[int, str], Where]
"""Where the value of a row and a column stands."""

GAP = 20.0
"""An interval so many times the usual one is a gap."""


def check(bench: Bench, lines: Sequence[str], places: Mapping[str, int], mark: str) -> None:
    """Raise `Faults` for what cannot be; `places` the column of each quantity, for messages."""

    def at(row: int, name: str) -> Where:
        text = lines[bench.line[row] - 1]
        cells = text.split(mark)
        before = sum(len(cell) + 1 for cell in cells[: places[name]])
        cell = cells[places[name]]
        return Where(
            bench.file, int(bench.line[row]), before + len(cell) - len(cell.lstrip()) + 1, max(len(cell.strip()), 1), text
        )

    wrong = [fault for fault in (_time(bench, at), _strain(bench, at), _pressure(bench, at), _force(bench, at)) if fault]
    if wrong:
        raise Faults(wrong)


def _first(bad: NDArray[np.bool_]) -> int | None:
    """The first row where something holds, None where it holds nowhere."""
    found = np.flatnonzero(bad)
    return int(found[0]) if len(found) else None


def _time(bench: Bench, at: Place) -> Fault | None:
    far = _first(np.abs(bench.time) > MOST_TIME_S)
    if far is not None:
        return Fault(at(far, "time_s"), f"a time of {bench.time[far]:g} s", f"at most {MOST_TIME_S:g} s", "begin at 0")
    step = np.diff(bench.time)
    back = _first(step <= 0.0)
    if back is not None:
        how = "repeats" if step[back] == 0.0 else "goes back from"
        found = f"time {how} that of line {bench.line[back]}, {bench.time[back]:g} s"
        return Fault(at(back + 1, "time_s"), found, "times that rise from row to row")
    usual = float(np.median(step))
    gap = _first(step > GAP * usual)
    if gap is not None:
        found = f"a gap: {step[gap]:.4g} s after line {bench.line[gap]}, where rows are {usual:.4g} s apart"
        hint = "fit the parts by themselves: what the fiber did between is not known"
        return Fault(at(gap + 1, "time_s"), found, f"at most {GAP:g} times the usual interval", hint)
    return None


def _strain(bench: Bench, at: Place) -> Fault | None:
    most, least = int(np.argmax(bench.strain)), int(np.argmin(bench.strain))
    share = "strain as a share of rest length: 0.3, not 30"
    if bench.strain[most] > MOST_STRAIN:
        found = f"a strain of {bench.strain[most]:g}, which is {100.0 * bench.strain[most]:g} %"
        return Fault(at(most, "strain"), found, f"at most {MOST_STRAIN:g}; {share}", "if these are percent, divide them by 100")
    if bench.strain[least] < LEAST_STRAIN:
        hint = "strain is positive in the fiber's own direction, shortening or lengthening, and 0 at rest"
        return Fault(at(least, "strain"), f"a strain of {bench.strain[least]:g}", f"at least {LEAST_STRAIN:g}", hint)
    moved = float(np.ptp(bench.strain))
    if moved < LEAST_MOVED:
        found = f"strain changes by {moved:.3g} in all"
        return Fault(Where(bench.file), found, f"a fiber that moves by {LEAST_MOVED:g} at least; {share}")
    return None


def _pressure(bench: Bench, at: Place) -> Fault | None:
    kPa = bench.pressure / 1e3
    most, least = int(np.argmax(kPa)), int(np.argmin(kPa))
    if kPa[most] > MOST_PRESSURE_KPA:
        hint = "if these are Pa, divide them by 1000" if kPa[most] > 1e4 else ""
        return Fault(
            at(most, "pressure_kPa"), f"a pressure of {kPa[most]:g} kPa", f"at most {MOST_PRESSURE_KPA:g}, gauge", hint
        )
    if kPa[least] < LEAST_PRESSURE_KPA:
        found = f"a pressure of {kPa[least]:g} kPa"
        return Fault(at(least, "pressure_kPa"), found, f"gauge pressures, at least {LEAST_PRESSURE_KPA:g}")
    swing = float(np.ptp(kPa))
    if swing < LEAST_SWING_KPA:
        found = f"pressure changes by {swing:.3g} kPa in all"
        hint = "if these are bar, multiply them by 100; if MPa, by 1000"
        return Fault(Where(bench.file), found, f"a swing of {LEAST_SWING_KPA:g} kPa at least", hint)
    return None


def _force(bench: Bench, at: Place) -> Fault | None:
    if bench.force is None:
        return None
    most, least = int(np.argmax(bench.force)), int(np.argmin(bench.force))
    if bench.force[most] > MOST_FORCE_N:
        return Fault(at(most, "force_N"), f"a force of {bench.force[most]:g} N", f"at most {MOST_FORCE_N:g} N")
    if bench.force[least] < -0.1 * max(float(bench.force[most]), 0.1):
        hint = "force is positive against the fiber's motion: turn the sign of the column"
        return Fault(at(least, "force_N"), f"a force of {bench.force[least]:g} N", "forces from 0 on", hint)
    return None
