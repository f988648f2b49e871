"""The programme as a circulation, the form in which it is solved: forces, in strokes, that rows and costs pass between events.

The dual of least-cost displacement under difference rows is a flow of greatest value (Rockafellar 1984): one balance an
event, one arc a row, bounded arcs for what displacement costs. It has far fewer equations than the programme has rows,
and a free start with nothing but a rest before it and a move behind it needs none: what it costs is a function of the
two hits alone. HiGHS (Huangfu and Hall 2018) solves it by its dual simplex; the balances' multipliers are the shifts.
"""

from collections.abc import Callable
from dataclasses import dataclass

import highspy
import numpy as np
from numpy.typing import NDArray
from scipy import sparse

Array = NDArray[np.float64]
Index = NDArray[np.int64]

TOLERANCE = 1e-10
"""Feasibility of HiGHS, primal (scaled strokes) and dual (s); the tightest that it takes."""


class Unsolved(Exception):
    """The solver gave up; `status` and `message` are its own, `tried` says what it was given."""

    def __init__(self, status: str, message: str, tried: str):
        self.status, self.tried = status, tried
        super().__init__(message)


@dataclass(frozen=True, slots=True)
class Budget:
    """How long all may take: `clock` says the time in s, `until` when it is up; `tell` hears what is being done."""

    clock: Callable[[], float]
    until: float
    tell: Callable[[str], None] | None = None

    def left(self) -> float:
        """Seconds left."""
        return self.until - self.clock()

    def say(self, text: str) -> None:
        """Tell whoever waits what is being done."""
        if self.tell is not None:
            self.tell(text)


ENDLESS = Budget(lambda: 0.0, np.inf)
"""As long as it takes."""


@dataclass(frozen=True, slots=True, eq=False)
class Arcs:
    """C arcs over n nodes: what each asks of the shifts, and the bounds of its force.

    later, earlier: nodes whose difference is asked for, -1 for what stands still; least_s; lowest, most: bounds of force

    An arc with bounds 0 and inf is a row `shift[later] - shift[earlier] >= least_s`; with a finite bound a row that may be
    broken at that price; from -w to w, with least 0, a cost `w * |shift[later] - shift[earlier]|`.
    """

    later: Index
    earlier: Index
    least_s: Array
    lowest: Array
    most: Array


@dataclass(frozen=True, slots=True, eq=False)
class Wide:
    """W further rows of any number of nodes: matrix (W, n) csr, least_s, and the price at which each may be broken."""

    matrix: sparse.csr_array
    least_s: Array
    most: Array


def merged(arcs: Arcs, nodes: int) -> tuple[Arcs, Index, Array]:
    """The arcs, those that ask the same of the same nodes made one, and for each arc given its group and its share of force.

    Of rows between the same two nodes only the one that asks most can hold; rows that may be broken add up their prices.
    """
    hard = np.isinf(arcs.most)
    pair = (arcs.later + 1) * (nodes + 1) + arcs.earlier + 1
    kind = np.where(hard, 0, np.where(arcs.lowest < 0.0, 1, 2))
    order = np.lexsort((-arcs.least_s, pair * 3 + kind))
    key, least = (pair * 3 + kind)[order], arcs.least_s[order]
    new = np.ones(len(order), dtype=bool)
    new[1:] = (key[1:] != key[:-1]) | (~hard[order][1:] & (least[1:] != least[:-1]))
    group = np.empty(len(order), dtype=np.int64)
    group[order] = np.cumsum(new) - 1
    first = order[new]
    share = np.zeros(len(order))
    share[first] = 1.0
    soft = np.flatnonzero(~hard)
    count = len(first)
    most, lowest = np.full(count, np.inf), np.zeros(count)
    total = np.bincount(group[soft], weights=arcs.most[soft], minlength=count)
    share[soft] = arcs.most[soft] / total[group[soft]]
    some = np.bincount(group[soft], minlength=count) > 0
    most[some] = total[some]
    lowest[some] = np.bincount(group[soft], weights=arcs.lowest[soft], minlength=count)[some]
    return Arcs(arcs.later[first], arcs.earlier[first], arcs.least_s[first], lowest, most), group, share


def circulate(arcs: Arcs, wide: Wide, nodes: int, budget: Budget = ENDLESS) -> tuple[Array, Array, Array] | None:
    """The forces of arcs (C,) and wide rows (W,) and the shifts (nodes,) at the optimum; None where no shifts keep the rows.

    Raises Unsolved where HiGHS fails or runs past its budget.
    """
    count = len(arcs.least_s)
    if not count + len(wide.least_s) or not nodes:
        return np.zeros(count), np.zeros(len(wide.least_s)), np.zeros(nodes)
    few, group, share = merged(arcs, nodes)
    solver = Quiet()
    options: dict[str, object] = {
        "primal_feasibility_tolerance": TOLERANCE,
        "dual_feasibility_tolerance": TOLERANCE,
        "solver": "simplex",
        "simplex_strategy": 1,
        "presolve": "off",
        "threads": 1,
        "parallel": "off",
        "random_seed": 0,
    }
    left = budget.left()
    tried = f"a programme of {nodes} moments and {len(few.least_s) + len(wide.least_s)} rows"
    if left <= 0.0:
        raise Unsolved("kTimeLimit", "Time limit reached", tried)
    if np.isfinite(left):
        options["time_limit"] = left
    for name, value in options.items():
        solver.setOptionValue(name, value)
    solver.passModel(_model(few, wide, nodes))
    solver.run()
    status = solver.getModelStatus()
    if status in (highspy.HighsModelStatus.kUnbounded, highspy.HighsModelStatus.kUnboundedOrInfeasible):
        return None
    if status != highspy.HighsModelStatus.kOptimal:
        raise Unsolved(status.name, solver.modelStatusToString(status), tried)
    found = solver.getSolution()
    force = np.array(found.col_value)
    return force[: len(few.least_s)][group] * share, force[len(few.least_s) :], -np.array(found.row_dual)


class Quiet(highspy.Highs):
    """HiGHS that prints nothing, not even its name, which it does where callbacks are set up before it is told not to."""

    def enableCallbacks(self) -> None:
        """Set up callbacks in silence."""
        self.setOptionValue("output_flag", False)
        super().enableCallbacks()


def _model(arcs: Arcs, wide: Wide, nodes: int) -> highspy.HighsLp:
    matrix = sparse.vstack([between(arcs.later, arcs.earlier, nodes), wide.matrix], format="csr")
    most = np.concatenate((arcs.most, wide.most))
    model = highspy.HighsLp()
    model.num_col_, model.num_row_ = len(most), nodes
    model.col_cost_ = -np.concatenate((arcs.least_s, wide.least_s))
    model.col_lower_ = np.concatenate((arcs.lowest, np.zeros(len(wide.most))))
    model.col_upper_ = np.where(np.isfinite(most), most, highspy.kHighsInf)
    model.row_lower_ = model.row_upper_ = np.zeros(nodes)
    # Row by row of arcs is column by column of the balances.
    model.a_matrix_.format_ = highspy.MatrixFormat.kColwise
    model.a_matrix_.start_ = matrix.indptr
    model.a_matrix_.index_ = matrix.indices
    model.a_matrix_.value_ = matrix.data
    return model


def between(later: Index, earlier: Index, nodes: int) -> sparse.csr_array:
    """(C, nodes) `shift[later] - shift[earlier]`; -1 stands still."""
    both = np.column_stack((later, earlier)).ravel()
    real = both >= 0
    values = np.tile([1.0, -1.0], len(later))[real]
    starts = np.concatenate(([0], np.cumsum(real.reshape(-1, 2).sum(axis=1))))
    return sparse.csr_array((values, both[real], starts), shape=(len(later), nodes))
