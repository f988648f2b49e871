"""Fitting a make: the parameters that bring the modelled strain closest to the measured, few outliers notwithstanding."""

import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import product

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares

from composer.faults import Fault, Faults, Where
from composer.fiber.contractile import COS2_LIMIT
from composer.fit.bench import Bench, thinned
from composer.fit.fitted import CONFIDENCE, Fitted, Found
from composer.fit.known import Known, make_of
from composer.fit.model import Drive, drive_of, strain_on
from composer.fit.parameters import SLEEVE, Parameter
from composer.fit.smooth import noise
from composer.fit.uncertainty import Uncertainty, robust_scale, uncertainty

Array = NDArray[np.float64]

MOST_ROWS = 8000
"""Rows that are fitted at most; a longer bench is taken in means of several rows."""

REFINED = 3
"""Best of the starts that are followed to their end."""

SOFT = 1.5
"""Residuals beyond so many standard deviations begin to count less than their square."""

STEP = 1e-5
"""Step of differences, in the parameters' own scales."""

ALIKE = 0.95
"""Correlation from which two parameters are hardly told apart."""

DRAWS = 60
"""Other draws of the sensors' noise that the fit is played through, to see what it does to the parameters."""

POOR = 0.05
"""Left-over noise above this share of the stroke: the model does not describe the data."""

Progress = Callable[[float], None]


@dataclass(frozen=True, slots=True, eq=False)
class Problem:
    """One fit: the drive, the strain measured (N,), what is known, what is looked for, and what is held meanwhile."""

    drive: Drive
    measured: Array
    known: Known
    free: tuple[Parameter, ...]
    held: dict[str, float]

    def values(self, theta: Array) -> dict[str, float]:
        """Parameters by key from the solver's, which are in units of their scales."""
        found = {each.key: float(value) * each.scale for each, value in zip(self.free, theta, strict=True)}
        return {**self.held, **found}

    def strain(self, theta: Array) -> Array:
        """The strain (N,) that these parameters give."""
        make = make_of(self.known, {"max_pressure_kPa": 1.0, **self.values(theta)})
        base = getattr(make, "base", make)
        stop = make.stop() if base is not make else base.shape().stop
        return strain_on(self.drive, base.shape(), stop, base.friction_fraction, base.settle_ms * 1e-3)

    def residual(self, theta: Array) -> Array:
        """Modelled less measured strain (N,)."""
        return self.strain(theta) - self.measured

    def jacobian(self, theta: Array) -> Array:
        """Slopes (N, P) of the residual, by central differences, one-sided at a bound."""
        low, high = self.bounds()
        columns = []
        for number in range(len(theta)):
            ends = []
            for way in (-STEP, STEP):
                moved = theta.copy()
                moved[number] = min(max(theta[number] + way, low[number]), high[number])
                ends.append((moved[number], self.strain(moved)))
            (a, before), (b, after) = ends
            columns.append((after - before) / (b - a))
        return np.column_stack(columns)

    def bounds(self) -> tuple[Array, Array]:
        """Lower and upper bounds (P,) of the solver's parameters."""
        return (
            np.array([each.low / each.scale for each in self.free]),
            np.array([each.high / each.scale for each in self.free]),
        )


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
    theta = _solve(problem, starts, progress)
    sure = _uncertainty(problem, theta, short)
    # What the data do not touch at all is held at what is known or usual, and the others are found anew.
    blind = [
        number
        for number, each in enumerate(problem.free)
        if sure.half[number] * each.scale > (each.high - each.low) / 2.0 or sure.blind[number] and _idle(problem, theta, number)
    ]
    if blind and len(blind) < len(problem.free):
        untold = tuple(problem.free[number] for number in blind)
        held = {each.key: _usual(each, known, short) for each in untold}
        problem = replace(problem, free=tuple(each for each in problem.free if each not in untold), held=held)
        theta = _solve(problem, starts, progress)
        sure = _uncertainty(problem, theta, short)
        return _fitted(bench, short, problem, theta, sure, untold, known)
    return _fitted(bench, short, problem, theta, sure, (), known)


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


def _solve(problem: Problem, starts: dict[str, tuple[float, ...]], progress: Progress) -> Array:
    """The best parameters (P,), in their scales, from the best few of all starts."""
    low, high = problem.bounds()
    grid = list(product(*(starts[each.key] for each in problem.free)))
    scales = np.array([each.scale for each in problem.free])
    thetas = [np.clip(np.array(start) / scales, low, high) for start in grid]
    costs = [float(np.mean(np.abs(problem.residual(theta)))) for theta in thetas]
    order = np.argsort(costs, kind="stable")[:REFINED]
    soft = max(SOFT * robust_scale(problem.residual(thetas[order[0]])), 1e-7)
    best: tuple[float, Array] | None = None
    for done, number in enumerate(order):
        found = _least(problem, thetas[number], soft, 60)
        progress((done + 1) / (len(order) + 2))
        cost = float(np.mean(np.abs(problem.residual(found))))
        if best is None or cost < best[0]:
            best = (cost, found)
    assert best is not None
    theta = best[1]
    for _ in range(2):
        # The scale of what is left is known only once a fit has been found.
        theta = _least(problem, theta, soft_scale(problem.residual(theta)), 200)
    progress(1.0)
    return theta


def soft_scale(residual: Array) -> float:
    """The size of a residual in strain from which it counts less than its square."""
    return max(SOFT * robust_scale(residual), 1e-7)


def _least(problem: Problem, theta: Array, soft: float, most: int) -> Array:
    """The nearest least of the soft_l1 loss."""
    low, high = problem.bounds()
    inside = np.clip(theta, low + 1e-6 * (high - low), high - 1e-6 * (high - low))
    # In units of the soft scale, so that the solver's tolerances mean the same for any fiber.
    return least_squares(
        lambda at: problem.residual(at) / soft,
        inside,
        jac=lambda at: problem.jacobian(at) / soft,
        bounds=(low, high),
        loss="soft_l1",
        max_nfev=most,
        ftol=1e-9,
        xtol=1e-9,
        gtol=1e-9,
    ).x


def _uncertainty(problem: Problem, theta: Array, bench: Bench) -> Uncertainty:
    residual = problem.residual(theta)
    shaken = np.array([redrawn.strain(theta) for redrawn in _redrawn(problem, bench)]).reshape(-1, len(residual))
    return uncertainty(
        residual,
        problem.jacobian(theta),
        soft_scale(residual),
        CONFIDENCE,
        shaken - problem.strain(theta) if len(shaken) else shaken,
    )


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
            found.append(Found(each.key, each.unit, value, each.low, each.high, False, _why_untold(each, known)))
            continue
        number = problem.free.index(each)
        half = float(sure.half[number]) * each.scale
        low, high = max(value - half, each.low), min(value + half, each.high)
        told = each.told(value, half)
        found.append(Found(each.key, each.unit, value, low, high, told, "" if told else _why_loose(each, beside)))
    notes = list(_notes(bench, known, left, stroke))
    highest = float(short.pressure.max()) / 1e3
    make = make_of(known, {"max_pressure_kPa": _floor(highest), **values})
    if "max_pressure_kPa" not in known.values:
        notes.append(
            f"max_pressure_kPa is the highest pressure of the bench, {_floor(highest):g} kPa: nothing beyond it was tried"
        )
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
    if bench.pressure.min() > 90e3 and bench.strain[np.argmin(bench.pressure)] < 0.1 * stroke:
        yield "pressure is never below 90 kPa, and the fiber is near rest there: are these absolute pressures? Gauge is meant."
    if bench.ignored:
        yield "columns that were not used: " + ", ".join(name[:40] or "(no name)" for name in bench.ignored[:8])
