"""Fitting a make: the parameters that bring the modelled strain closest to the measured, few outliers notwithstanding."""

import math
from collections.abc import Iterator, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy.stats import chi2

from composer.faults import Fault, Faults, Where
from composer.fiber.contractile import COS2_LIMIT
from composer.fit.bench import Bench, thinned
from composer.fit.fitted import CONFIDENCE, Fitted, Found
from composer.fit.known import Known, make_of
from composer.fit.model import drive_of
from composer.fit.parameters import SLEEVE, Parameter
from composer.fit.problem import Problem, Progress, near, soft_cost, soft_scale, solve
from composer.fit.smooth import noise
from composer.fit.uncertainty import Uncertainty, hanging_together, robust_scale, uncertainty

Array = NDArray[np.float64]

MOST_ROWS = 16_000
"""Rows that are fitted at most; a longer bench is taken in means of several, and what that does is part of what is told."""

ALIKE = 0.95
"""Correlation from which two parameters are hardly told apart."""

DRAWS = 60
"""Other draws of the sensors' noise that the fit is played through, to see what it does to the parameters."""

SHOWS = 0.999
"""Confidence from which a stop is believed to be there."""

MISSED = 1.5
"""Left-over noise above so many times that of the sensors: something that was given is not so."""

SEEN = 0.002
"""... unless it stays below this share of the stroke."""

POOR = 0.05
"""Left-over noise above this share of the stroke: the model does not describe the data."""


def fit_modelled(bench: Bench, known: Known, progress: Progress = lambda share: None) -> Fitted:
    """The make that explains a bench best. Raises `Faults` for data that no fiber of its kind can have shown."""
    _check_stroke(bench, known)
    short = thinned(bench, MOST_ROWS)
    drive = drive_of(short, known.load_N)
    starts = {each.key: _starts(each, known, short) for each in known.parameters}
    problem = Problem(drive, short.strain, known, known.parameters, {})
    if not problem.free:
        theta = np.zeros(0)
        return _fitted(bench, short, problem, theta, None, (), known)
    theta = solve(problem, starts, progress)
    if SLEEVE in problem.free and not _sleeve_shows(problem, theta):
        return _without(bench, short, problem, (SLEEVE,), starts, progress)
    sure = _uncertainty(problem, theta, bench, short)
    # What the data do not touch at all is held at what is known or usual, and the others are found anew.
    blind = [
        number
        for number, each in enumerate(problem.free)
        if sure.half[number] * each.scale > (each.high - each.low) / 2.0
        or (sure.blind[number] and _idle(problem, theta, number))
    ]
    if blind and len(blind) < len(problem.free):
        return _without(bench, short, problem, tuple(problem.free[number] for number in blind), starts, progress)
    return _fitted(bench, short, problem, theta, sure, (), known)


def _without(
    bench: Bench,
    short: Bench,
    problem: Problem,
    untold: tuple[Parameter, ...],
    starts: dict[str, tuple[float, ...]],
    progress: Progress,
) -> Fitted:
    """The fit with what the data do not touch held at what is known or usual."""
    held = {each.key: _usual(each, problem.known, short) for each in untold}
    fewer = replace(problem, free=tuple(each for each in problem.free if each not in untold), held=held)
    theta = solve(fewer, starts, progress)
    return _fitted(bench, short, fewer, theta, _uncertainty(fewer, theta, bench, short), untold, problem.known)


def _sleeve_shows(problem: Problem, theta: Array) -> bool:
    """Whether the data are plainly worse explained by a sleeve that is never pulled straight.

    Of a fiber that was not filled so far, the limit that fits best is where its highest strain happens to lie.
    """
    free = tuple(each for each in problem.free if each is not SLEEVE)
    endless = replace(problem, free=free, held={SLEEVE.key: SLEEVE.high})
    at = solve(endless, {each.key: (problem.values(theta)[each.key],) for each in free}, lambda share: None)
    residual = problem.residual(theta)
    gained = soft_cost(endless.residual(at), residual) - soft_cost(residual, residual)
    return gained / hanging_together(residual) > chi2.ppf(SHOWS, 1)


def _check_stroke(bench: Bench, known: Known) -> None:
    most = int(np.argmax(bench.strain))
    limit = 1.0 - math.sqrt(COS2_LIMIT) + 0.03
    if known.base == "contractile" and bench.strain[most] > limit:
        found = f"a strain of {bench.strain[most]:g}, which is {100.0 * bench.strain[most]:g} %"
        expected = "at most 0.42, where every braid stops; strain as a share of rest length: 0.3, not 30"
        raise Faults([Fault(Where(bench.file, int(bench.line[most])), found, expected)])


def _starts(each: Parameter, known: Known, bench: Bench) -> tuple[float, ...]:
    """Where to begin to look for a parameter: what the rig says first, then what is usual."""
    usual = each.starts
    if each is SLEEVE:
        # A little short of the largest strain: from above, a sleeve that is never pulled straight shows no slope.
        usual = (0.98 * float(np.quantile(bench.strain, 0.995)),)
    mine = (known.starts[each.key],) if each.key in known.starts and each is not SLEEVE else ()
    return tuple(min(max(start, each.low), each.high) for start in dict.fromkeys((*mine, *usual)))


def _usual(each: Parameter, known: Known, bench: Bench) -> float:
    """What a parameter is held at where the data say nothing of it."""
    if each.key in known.starts:
        return known.starts[each.key]
    if each is SLEEVE:
        return min(max(float(np.max(bench.strain)), each.low), each.high)
    default = next((key.default for key in known.keys if key.name == each.key and not key.required), None)
    return float(default) if default is not None else each.starts[len(each.starts) // 2]


def _idle(problem: Problem, theta: Array, number: int) -> bool:
    """Whether a parameter by itself changes nothing."""
    return float(np.abs(problem.jacobian(theta)[:, number]).max()) < 1e-9


def _uncertainty(problem: Problem, theta: Array, bench: Bench, short: Bench) -> Uncertainty:
    residual = problem.residual(theta)
    strain = problem.strain(theta)
    shaken = np.array([redrawn.strain(theta) - strain for redrawn in _redrawn(problem, short)])
    soft = soft_scale(residual)
    sure = uncertainty(residual, problem.jacobian(theta), soft, CONFIDENCE, shaken.reshape(-1, len(residual)))
    if short.rows == bench.rows:
        return sure
    # Rows half as close move the parameters by more than those at hand have moved them from what every row would give.
    coarse = thinned(bench, MOST_ROWS // 2)
    other = replace(problem, drive=drive_of(coarse, problem.known.load_N), measured=coarse.strain)
    return replace(sure, half=sure.half + np.abs(near(other, theta) - theta))


def _redrawn(problem: Problem, bench: Bench) -> Iterator[Problem]:
    """The problem with the drive as it would have been measured with other noise on what is now taken for the truth."""
    true = replace(bench, pressure=problem.drive.pressure)
    levels = noise(bench.pressure), 0.0 if bench.force is None else noise(bench.force)
    if not any(levels):
        return
    draws = np.random.default_rng(0)
    for _ in range(DRAWS):
        pressure = true.pressure + levels[0] * draws.standard_normal(bench.rows)
        force = None
        if bench.force is not None:
            force = problem.drive.load + levels[1] * draws.standard_normal(bench.rows)
        yield replace(problem, drive=drive_of(replace(true, pressure=pressure, force=force), problem.known.load_N))


def _fitted(
    bench: Bench,
    short: Bench,
    problem: Problem,
    theta: Array,
    sure: Uncertainty | None,
    untold: Sequence[Parameter],
    known: Known,
) -> Fitted:
    values = problem.values(theta)
    strain = problem.strain(theta)
    left = robust_scale(strain - short.strain)
    stroke = float(np.quantile(short.strain, 0.999) - min(float(np.quantile(short.strain, 0.001)), 0.0))
    beside = _beside(problem.free, sure)
    found = []
    for each in known.parameters:
        value = values[each.key]
        if each in untold or sure is None:
            found.append(Found(each.key, each.unit, value, each.low, each.high, False, _why_untold(each, known), held=True))
            continue
        number = problem.free.index(each)
        half = float(sure.half[number]) * each.scale
        low, high = max(value - half, each.low), min(value + half, each.high)
        told = each.told(value, half)
        found.append(Found(each.key, each.unit, value, low, high, told, "" if told else _why_loose(each, beside)))
    notes = list(_notes(short, known, left, stroke))
    highest = float(problem.drive.pressure.max()) / 1e3
    make = make_of(known, {"max_pressure_kPa": _floor(highest), **values})
    if "max_pressure_kPa" not in known.values:
        notes.append(f"max_pressure_kPa is the highest pressure of the bench: nothing beyond {_floor(highest):g} kPa was tried")
    elif highest > 1.02 * known.values["max_pressure_kPa"]:
        notes.append(f"the bench went up to {highest:.4g} kPa, above max_pressure_kPa, {known.values['max_pressure_kPa']:g}")
    base = getattr(make, "base", make)
    flat = {key.name: getattr(make, key.name, getattr(base, key.name, None)) for key in known.keys if key.name != "base"}
    if base is not make:
        flat = {"base": known.base, **flat}
    return Fitted(
        name=known.name,
        kind=known.kind,
        values={name: value for name, value in flat.items() if value is not None},
        found=tuple(found),
        known=known.come,
        load_N=None if bench.force is not None else known.load_N,
        rows=bench.rows,
        used=short.rows,
        time=short.time,
        pressure=short.pressure,
        measured=short.strain,
        strain=strain,
        noise=left,
        stroke=stroke,
        beside=beside,
        notes=tuple(notes),
    )


def _floor(kPa: float) -> float:
    """A pressure to three digits, downward."""
    step = 10.0 ** (math.floor(math.log10(kPa)) - 2)
    return math.floor(kPa / step + 1e-9) * step


def _beside(free: Sequence[Parameter], sure: Uncertainty | None) -> tuple[tuple[str, str, float], ...]:
    if sure is None:
        return ()
    pairs = [(a, b) for a in range(len(free)) for b in range(a + 1, len(free))]
    return tuple(
        (free[a].key, free[b].key, float(np.clip(sure.correlation[a, b], -1.0, 1.0)))
        for a, b in pairs
        if abs(sure.correlation[a, b]) >= ALIKE
    )


def _why_untold(each: Parameter, known: Known) -> str:
    came = "the rig's value" if each.key in known.starts else "a usual value"
    if each is SLEEVE:
        came = "the rig's value" if each.key in known.starts else "the largest strain measured"
        return f"the sleeve was never pulled straight; {came} is held"
    return f"the bench says nothing of it; {came} is held"


_MORE = {
    "settle_ms": "it needs quick changes of pressure, in rows no further apart than the lag itself",
    "friction_fraction": "it needs pressure that goes both up and down",
    "shear_modulus_kPa": "it needs pressures from rest to full, and the wall measured well",
    "braid_angle_deg": "it needs pressures near full, or braid_angle_deg measured and written in the head",
    "end_factor": "it needs pressures near full, or braid_angle_deg measured and written in the head",
    "sleeve_limit": "it needs pressure that pulls the sleeve straight",
}


def _why_loose(each: Parameter, beside: Sequence[tuple[str, str, float]]) -> str:
    for a, b, _ in beside:
        if each.key in (a, b):
            return f"it cannot be told apart from {b if each.key == a else a}; {_MORE[each.key]}"
    return _MORE[each.key]


def _notes(bench: Bench, known: Known, left: float, stroke: float) -> Iterator[str]:
    if bench.force is None and not known.said_load:
        yield "no load was given, so none is assumed; a line # load_N = 1.5 above the header, or --load, says what it was"
    if left > POOR * stroke:
        yield (
            f"the fit misses the data by {left:.2g} of strain, {100.0 * left / stroke:.0f} % of the stroke: this make does not"
            " explain this bench; look at the picture, the units, the load and the dimensions"
        )
    elif left > max(MISSED * noise(bench.strain), SEEN * stroke):
        yield (
            f"the fit misses the data by {left:.2g} of strain, where the sensor's own noise is {noise(bench.strain):.2g}:"
            " load or dimensions may not be as given, or this fiber does what its kind does not"
        )
    if bench.pressure.min() > 90e3 and bench.strain[np.argmin(bench.pressure)] < 0.1 * stroke:
        yield "pressure is never below 90 kPa, and the fiber is near rest there: are these absolute pressures? Gauge is meant."
    if bench.ignored:
        yield "columns that were not used: " + ", ".join(name[:40] or "(no name)" for name in bench.ignored[:8])
