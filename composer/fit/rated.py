"""Fitting a rated fiber: its stroke from where it comes to stand, its rates from its fastest moves."""

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from scipy.stats import t as student

from composer.faults import fault
from composer.fit.bench import Bench, thinned
from composer.fit.fitted import Fitted, Found
from composer.fit.known import Known, make_of
from composer.fit.smooth import noise, smoothed, turns
from composer.fit.uncertainty import hanging_together

Array = NDArray[np.float64]

MOST_ROWS = 50_000
LONG = 0.6
"""A move counts if it goes through this share of the stroke or more."""

FROM, TO = 0.1, 0.9
"""Its rate is taken between these shares of the stroke, or of the part that it goes through."""

NEAR = 0.9
"""Moves at this share of the fastest rate or more are the fastest parts; their mean is the rate."""

LEAST_ROWS = 4
"""Rows that a move must have between those shares for a slope."""

SHARE = 0.1
"""A rate is told where its interval reaches no further than this share to either side."""


def fit_rated(bench: Bench, known: Known) -> Fitted:
    """Stroke and rates of a bench. Raises `Faults` where the fiber makes no whole move in it."""
    short = thinned(bench, MOST_ROWS)
    level = noise(short.strain)
    clean = smoothed(short.strain)
    least = max(6.0 * noise(clean), 0.05 * float(np.ptp(clean)))
    rows = turns(clean, least)
    rows = np.append(rows, len(clean) - 1) if rows[-1] < len(clean) - 1 else rows
    stroke, half, stands = _stroke(short, clean, level)
    fill, exhaust = _rates(short, clean, rows, stroke)
    found = [Found("stroke", "", stroke, max(stroke - half, 0.0), stroke + half, half <= 0.05 * stroke)]
    values: dict[str, float] = {"stroke": stroke}
    for key, rates in (("fill_rate_per_s", fill), ("exhaust_rate_per_s", exhaust)):
        found.append(_rate(bench, key, rates))
        values[key] = found[-1].value
    strain = _paced(clean, short.time, rows, values)
    given = {one.key: known.values[one.key] for one in found if one.key in known.values}
    make = make_of(known, {**values, **given})
    notes = [] if stands else ["the fiber never came to stand at its highest: the stroke may be more"]
    if bench.ignored:
        notes.append("columns that were not used: " + ", ".join(name[:40] or "(no name)" for name in bench.ignored[:8]))
    flat = {key.name: getattr(make, key.name) for key in known.keys}
    return Fitted(
        name=known.name,
        kind=known.kind,
        values={name: value for name, value in flat.items() if value is not None},
        found=tuple(one for one in found if one.key not in given),
        known=known.come,
        load_N=None if bench.force is not None else known.load_N,
        rows=bench.rows,
        used=short.rows,
        time=short.time,
        pressure=short.pressure,
        measured=short.strain,
        strain=strain,
        noise=level,
        stroke=stroke,
        beside=(),
        notes=tuple(notes),
    )


def _stroke(bench: Bench, clean: Array, level: float) -> tuple[float, float, bool]:
    """Strain at full, half its interval, and whether the fiber came to stand there: the mean of what lies near the top."""
    top = float(np.quantile(clean, 0.998))
    near = clean >= 0.985 * top
    values = bench.strain[near]
    spread = float(values.std())
    stands = int(near.sum()) >= 10 and float(np.diff(bench.time, prepend=bench.time[0])[near].sum()) > 0.02 * float(
        np.ptp(bench.time)
    )
    stroke = float(np.median(values)) if stands else top
    half = 1.96 * spread * np.sqrt(hanging_together(values) / len(values)) if stands else max(spread, level, 1e-6) * 2.0
    return stroke, float(half), stands


def _rates(bench: Bench, clean: Array, rows: NDArray[np.int64], stroke: float) -> tuple[list, list]:
    """(rate, its standard error) of every long move up and down, positive both."""
    up: list[tuple[float, float]] = []
    down: list[tuple[float, float]] = []
    for first, last in pairwise(rows.tolist()):
        begin, end = float(clean[first]), float(clean[last])
        if abs(end - begin) < LONG * stroke:
            continue
        share = (clean[first : last + 1] - begin) / (end - begin)
        # The last row below and the first above, so that a stand at either end is no part of the move.
        beyond = int(np.argmax(share >= TO))
        before = beyond - int(np.argmax(share[beyond::-1] <= FROM))
        inside = slice(first + before, first + beyond + 1)
        time, strain = bench.time[inside], bench.strain[inside]
        if len(time) < LEAST_ROWS:
            continue
        # From one share to the other: the mean rate, which a fiber that slows down on its way keeps over all of it.
        rate = float(clean[first + beyond] - clean[first + before]) / float(time[-1] - time[0])
        centred = time - time.mean()
        slope = float(centred @ strain / (centred @ centred))
        left = strain - strain.mean() - slope * centred
        error = float(np.sqrt((left @ left) / max(len(time) - 2, 1) / (centred @ centred)))
        (up if end > begin else down).append((abs(rate), error))
    return up, down


def _rate(bench: Bench, key: str, moves: list[tuple[float, float]]) -> Found:
    if not moves:
        way = "fills" if key.startswith("fill") else "empties"
        raise fault(
            bench.file,
            f"the fiber never {way} through {100 * LONG:.0f} % of its stroke in {LEAST_ROWS} rows or more",
            f"at least one such move, for {key}, with rows close enough to see it",
        )
    rates, errors = np.array(moves).T
    fast = rates >= NEAR * rates.max()
    rate = float(rates[fast].mean())
    count = int(fast.sum())
    spread = float(rates[fast].std(ddof=1)) / np.sqrt(count) if count > 1 else 0.0
    within = float(np.sqrt((errors[fast] ** 2).sum())) / count
    half = float(max(spread * student.ppf(0.975, count - 1) if count > 1 else 0.0, 1.96 * within))
    told = half <= SHARE * rate
    why = "" if told else "more quick moves, in closer rows, would tell it"
    return Found(key, "1/s", rate, max(rate - half, 0.0), rate + half, told, why)


def _paced(clean: Array, time: Array, rows: NDArray[np.int64], values: dict[str, float]) -> Array:
    """The strain (N,) of a fiber that goes after the measured one no faster than the fitted rates."""
    up, down = values["fill_rate_per_s"], values["exhaust_rate_per_s"]
    now = float(clean[0])
    out = [now]
    for wanted, step in zip(clean[1:].tolist(), np.diff(time).tolist(), strict=True):
        now = min(max(wanted, now - down * step), now + up * step)
        out.append(now)
    return np.array(out)
