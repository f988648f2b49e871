"""The programme as a circulation, the form in which it is solved: forces, in strokes, that rows and costs pass between events.

The dual of least-cost displacement under difference rows is a flow of greatest value (Rockafellar 1984): one balance an
event, one arc a row, bounded arcs for what displacement costs. It has far fewer equations than the programme has rows,
and a free start with nothing but a rest before it and a move behind it needs none: what it costs is a function of the
two hits alone. HiGHS (Huangfu and Hall 2018) solves it by its dual simplex; the balances' multipliers are the shifts.
"""

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
    """The solver gave up; `status` and `message` are its own."""

    def __init__(self, status: str, message: str):
        self.status = status
        super().__init__(message)


@dataclass(frozen=True, slots=True, eq=False)
class Arcs:
    """C arcs over n nodes: matrix (C, n) csr, what each asks of the shifts; least_s; lowest, most (C,) bounds of its force.

    An arc with bounds 0 and inf is a row `matrix @ shift >= least_s`; with a finite bound a row that may be broken at that
    price; from -w to w, with least 0, a cost `w * |matrix @ shift|`.
    """

    matrix: sparse.csr_array
    least_s: Array
    lowest: Array
    most: Array


def circulate(arcs: Arcs, limit_s: float = np.inf) -> tuple[Array, Array] | None:
    """The forces (C,) and shifts (n,) at the optimum; None where no shifts keep the rows.

    Raises Unsolved where HiGHS fails or runs past `limit_s`.
    """
    count, nodes = arcs.matrix.shape
    if not count or not nodes:
        return np.zeros(count), np.zeros(nodes)
    solver = _Quiet()
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
    if np.isfinite(limit_s):
        options["time_limit"] = max(limit_s, 1e-3)
    for name, value in options.items():
        solver.setOptionValue(name, value)
    solver.passModel(_model(arcs, count, nodes))
    solver.run()
    status = solver.getModelStatus()
    if status in (highspy.HighsModelStatus.kUnbounded, highspy.HighsModelStatus.kUnboundedOrInfeasible):
        return None
    if status != highspy.HighsModelStatus.kOptimal:
        raise Unsolved(status.name, solver.modelStatusToString(status))
    found = solver.getSolution()
    return np.array(found.col_value), -np.array(found.row_dual)


class _Quiet(highspy.Highs):
    """HiGHS that prints nothing, not even its name, which it does where callbacks are set up before it is told not to."""

    def enableCallbacks(self) -> None:
        """Set up callbacks in silence."""
        self.setOptionValue("output_flag", False)
        super().enableCallbacks()


def _model(arcs: Arcs, count: int, nodes: int) -> highspy.HighsLp:
    model = highspy.HighsLp()
    model.num_col_, model.num_row_ = count, nodes
    model.col_cost_ = -arcs.least_s
    model.col_lower_, model.col_upper_ = arcs.lowest, np.where(np.isfinite(arcs.most), arcs.most, highspy.kHighsInf)
    model.row_lower_ = model.row_upper_ = np.zeros(nodes)
    # By arcs is by columns of the balances.
    model.a_matrix_.format_ = highspy.MatrixFormat.kColwise
    model.a_matrix_.start_ = arcs.matrix.indptr
    model.a_matrix_.index_ = arcs.matrix.indices
    model.a_matrix_.value_ = arcs.matrix.data
    return model
