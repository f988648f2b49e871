"""A programme that stays in the solver: rows come and go and bounds move, and each solve begins where the last one ended."""

import highspy
import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from composer.retime.flow import Budget, Unsolved, between, quiet
from composer.retime.rows import Rows
from composer.retime.terms import Contracted

Array = NDArray[np.float64]
Index = NDArray[np.int64]


class Resident:
    """The least-cost shifts of n events, subject to rows that stay, rows that come and go, and a box about some shifts.

    Columns: n shifts, what each of T terms is above and below what it wants, and how far the passing rows may be broken.
    """

    def __init__(self, rows: Rows, chosen: Index, events: Index, terms: Contracted, price: float, budget: Budget):
        """rows `chosen` stay; `price` is what a second costs by which the most broken of the passing rows is, in strokes."""
        number = np.full(rows.matrix.shape[1], -1, dtype=np.int64)
        number[events] = np.arange(len(events))
        self.n, self.terms, self.budget = len(events), len(terms.event), budget
        self.at, self.behind = number[terms.event], np.where(terms.behind >= 0, number[terms.behind], -1)
        self.weight = np.maximum(terms.weight, 1e-9)
        apart = between(self.at, self.behind, self.n)
        one = sparse.eye_array(self.terms, format="csr")
        kept = sparse.csr_array(rows.matrix[chosen][:, events])
        slack = sparse.csr_array((self.terms + len(chosen), 1))
        below = sparse.hstack([kept, sparse.csr_array((len(chosen), 2 * self.terms))])
        left = sparse.vstack([sparse.hstack([apart, -one, one]), below])
        matrix = sparse.hstack([left, slack], format="csr")
        self.solver = quiet()
        self.solver.setOptionValue("dual_feasibility_tolerance", 1e-9)
        model = highspy.HighsLp()
        model.num_row_, model.num_col_ = matrix.shape
        model.col_cost_ = np.concatenate((np.zeros(self.n), self.weight, self.weight, [price]))
        model.col_lower_ = np.concatenate((np.full(self.n, -highspy.kHighsInf), np.zeros(2 * self.terms + 1)))
        model.col_upper_ = np.full(matrix.shape[1], highspy.kHighsInf)
        model.row_lower_ = np.concatenate((np.zeros(self.terms), rows.least[chosen]))
        model.row_upper_ = np.concatenate((np.zeros(self.terms), np.full(len(chosen), highspy.kHighsInf)))
        model.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
        model.a_matrix_.start_, model.a_matrix_.index_, model.a_matrix_.value_ = matrix.indptr, matrix.indices, matrix.data
        self.solver.passModel(model)
        self.stay = matrix.shape[0]
        self.price, self.last = price, matrix.shape[1] - 1

    def least(self, matrix: Array, least_s: Array, low: Array, high: Array) -> tuple[Array, float, float] | None:
        """Shifts (n,), their cost, and by how much the most broken of the passing rows is; None where no shifts fit the box.

        matrix, least_s: (R, n) and (R,) the rows of this time alone; low, high: (n,) the box
        Raises Unsolved where time is up.
        """
        solver = self.solver
        passing = solver.getNumRow() - self.stay
        if passing:
            solver.deleteRows(passing, np.arange(self.stay, self.stay + passing, dtype=np.int32))
        if len(least_s):
            rows = len(least_s)
            row, column = np.nonzero(matrix)
            each = np.bincount(row, minlength=rows)
            # The last entry of each row is how far it may be broken.
            stop = np.cumsum(each + 1)
            index, value = np.full(stop[-1], self.last, dtype=np.int32), np.ones(stop[-1])
            at = np.arange(len(row)) + row
            index[at], value[at] = column, matrix[row, column]
            start = (stop - each - 1).astype(np.int32)
            solver.addRows(rows, least_s, np.full(rows, highspy.kHighsInf), len(index), start, index, value)
        solver.changeColsBounds(self.n, np.arange(self.n, dtype=np.int32), low, high)
        left = self.budget.left()
        if left <= 0.0:
            raise Unsolved("kTimeLimit", "Time limit reached", "air")
        if np.isfinite(left):
            solver.setOptionValue("time_limit", solver.getRunTime() + left)
        solver.run()
        if solver.getModelStatus() != highspy.HighsModelStatus.kOptimal:
            return None
        found = np.array(solver.getSolution().col_value)
        return found[: self.n], float(solver.getInfo().objective_function_value - self.price * found[-1]), float(found[-1])

    def reprice(self, price: float) -> None:
        """Another price."""
        self.price = price
        self.solver.changeColCost(self.last, price)

    def forces(self) -> tuple[Array, Array]:
        """The dual values, in strokes, of the rows that stay and of those that passed, at the last solution."""
        dual = np.maximum(np.array(self.solver.getSolution().row_dual), 0.0)
        return dual[self.terms : self.stay], dual[self.stay :]

    def nearest(self, shift_s: Array) -> Array | None:
        """The shifts that keep the rows that stay and are nearest to some, (n,), term by term; None where none keep them."""
        padded = np.append(shift_s, 0.0)
        wanted = padded[self.at] - padded[self.behind]
        rows = np.arange(self.terms, dtype=np.int32)
        self.solver.changeRowsBounds(self.terms, rows, wanted, wanted)
        every = np.full(self.n, highspy.kHighsInf)
        found = self.least(np.empty((0, self.n)), np.empty(0), -every, every)
        self.solver.changeRowsBounds(self.terms, rows, np.zeros(self.terms), np.zeros(self.terms))
        return None if found is None else found[0]
