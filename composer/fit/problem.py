"""One fit of a make as a problem of least squares: residuals, their slopes, and the search from many starts."""

from collections.abc import Callable
from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares

from composer.fit.known import Known, make_of
from composer.fit.model import Drive, strain_on
from composer.fit.parameters import Parameter
from composer.fit.uncertainty import robust_scale

Array = NDArray[np.float64]

REFINED = 3
"""Best of the starts that are followed to their end."""

SOFT = 1.5
"""Residuals beyond so many standard deviations begin to count less than their square."""

STEP = 1e-5
"""Step of differences, in the parameters' own scales."""

Progress = Callable[[float], None]
"""Told how much of the work is done, 0 to 1."""


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


def solve(problem: Problem, starts: dict[str, tuple[float, ...]], progress: Progress) -> Array:
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


def soft_cost(residual: Array, typical: Array) -> float:
    """Twice the soft_l1 loss of residuals in units of what is typical of others: comparable with chi squared."""
    soft = soft_scale(typical) / robust_scale(typical) if robust_scale(typical) > 0.0 else SOFT
    u2 = (residual / max(robust_scale(typical), 1e-9) / soft) ** 2
    return float(2.0 * soft**2 * np.sum(np.sqrt(1.0 + u2) - 1.0))


def near(problem: Problem, theta: Array) -> Array:
    """The best parameters (P,) near others, such as those of a like problem."""
    return _least(problem, theta, soft_scale(problem.residual(theta)), 30)


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
