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

LARGE, NEAR, MANY = 500, 1.5, 0.05
"""Circulations of so many nodes begin with so many arcs a node; where more others than that share of nodes break, all go in."""


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
    pair = (arcs.later + 1) * (nodes + 1) + arcs.earlier + 1
    hard, soft = np.flatnonzero(np.isinf(arcs.most)), np.flatnonzero(~np.isinf(arcs.most))
    group, share = np.empty(len(pair), dtype=np.int64), np.zeros(len(pair))

    order = hard[np.argsort(pair[hard])]
    new = _fresh(pair[order])
    first = np.flatnonzero(new)
    group[order] = np.cumsum(new) - 1
    asks = np.maximum.reduceat(arcs.least_s[order], first) if len(first) else np.empty(0)
    most = order[arcs.least_s[order] == asks[group[order]]]
    # Of those that ask the same the first given holds, however they were sorted.
    chosen = np.full(len(first), len(pair))
    np.minimum.at(chosen, group[most], most)
    share[chosen] = 1.0

    order = soft[np.lexsort((arcs.least_s[soft], arcs.lowest[soft] < 0.0, pair[soft]))]
    new = _fresh(pair[order]) | _fresh(arcs.lowest[order] < 0.0) | _fresh(arcs.least_s[order])
    group[order] = np.cumsum(new) - 1
    total = np.bincount(group[order], weights=arcs.most[order])
    lowest = np.bincount(group[order], weights=arcs.lowest[order])
    share[order] = arcs.most[order] / total[group[order]]
    group[order] += len(chosen)
    chosen = np.concatenate((chosen, order[new]))
    return Arcs(
        arcs.later[chosen], arcs.earlier[chosen], arcs.least_s[chosen], np.concatenate((np.zeros(len(asks)), lowest)),
        np.concatenate((np.full(len(asks), np.inf), total)),
    ), group, share  # fmt: skip


def _fresh(values: NDArray[np.generic]) -> NDArray[np.bool_]:
    """Where a value differs from the one before it."""
    return np.append(True, values[1:] != values[:-1]) if len(values) else np.zeros(0, dtype=bool)


_ENDLESS = (highspy.HighsModelStatus.kUnbounded, highspy.HighsModelStatus.kUnboundedOrInfeasible)
"""What HiGHS calls a circulation without an optimum, which is a programme that no shifts keep."""


class Circulation:
    """A circulation that stays in the solver: nodes and arcs may be added, and it is solved again from where it was."""

    def __init__(self, arcs: Arcs, wide: Wide, nodes: int):
        """C arcs and W wide rows over some nodes."""
        self.few, self.group, self.share = merged(arcs, nodes)
        self.most, self.added = arcs.most.copy(), False
        self.most_of = self.few.most.copy()
        self.near = _near(self.few, nodes)
        within = np.flatnonzero(self.near)
        # Where each arc is in the solver, and where all that came beside the arcs.
        self.place = np.full(len(self.near), -1)
        self.place[within] = np.arange(len(within))
        self.beyond = len(within) + np.arange(len(wide.least_s))
        self.nodes, self.columns = nodes, len(within) + len(wide.least_s)
        self.solver = quiet()
        self.solver.passModel(_model(_picked(self.few, within), wide, nodes))

    def add(self, nodes: int, matrix: sparse.csr_array, least_s: Array, lowest: Array, most: Array) -> None:
        """More nodes, and rows or costs over all nodes: matrix (A, nodes in all), bounds of force as in Arcs."""
        if nodes:
            none = np.empty(0, dtype=np.int32)
            self.solver.addRows(nodes, np.zeros(nodes), np.zeros(nodes), 0, np.zeros(nodes, dtype=np.int32), none, np.empty(0))
            self.nodes += nodes
        if len(least_s):
            self.beyond = np.concatenate((self.beyond, self.columns + np.arange(len(least_s))))
            self._columns(matrix, least_s, lowest, most)
        self.added = True
        # What was the optimum still balances, so the primal simplex goes on from there.
        self.solver.setOptionValue("simplex_strategy", 4)

    def _columns(self, matrix: sparse.csr_array, least_s: Array, lowest: Array, most: Array) -> None:
        most = np.where(np.isfinite(most), most, highspy.kHighsInf)
        start, index = matrix.indptr[:-1].astype(np.int32), matrix.indices.astype(np.int32)
        self.solver.addCols(len(least_s), -least_s, lowest, most, matrix.nnz, start, index, matrix.data)
        self.columns += len(least_s)

    def close(self, arcs: Index) -> None:
        """Take costs from the programme: arcs with a finite bound of force, none of which may be below nothing."""
        self.most[arcs] = 0.0
        groups = np.unique(self.group[arcs])
        mine = np.flatnonzero(np.isin(self.group, groups))
        total = np.zeros(len(self.few.least_s))
        np.add.at(total, self.group[mine], self.most[mine])
        self.share[mine] = self.most[mine] / np.maximum(total[self.group[mine]], 1e-300)
        self.most_of[groups] = total[groups]
        groups = groups[self.near[groups]]
        self.solver.changeColsBounds(len(groups), self.place[groups].astype(np.int32), np.zeros(len(groups)), total[groups])

    def solve(self, budget: Budget = ENDLESS) -> tuple[Array, Array, Array] | None:
        """Forces of the arcs (C,), of all given or added beyond, and shifts (nodes,); None where no shifts keep the rows.

        Raises Unsolved where HiGHS fails or runs past its budget.
        """
        if not self.columns or not self.nodes:
            return np.zeros(len(self.group)), np.zeros(len(self.beyond)), np.zeros(self.nodes)
        while True:
            if not self._run(budget):
                return None
            found = self.solver.getSolution()
            shift = -np.array(found.row_dual)
            if not self._broken(shift):
                break
        flow = np.array(found.col_value)
        force = np.zeros(len(self.near))
        force[self.near] = flow[self.place[self.near]]
        return force[self.group] * self.share, flow[self.beyond], shift

    def _run(self, budget: Budget) -> bool:
        """Solve what is in the solver; whether shifts keep its rows."""
        left, solver = budget.left(), self.solver
        tried = f"a programme of {self.nodes} moments and {self.columns} rows"
        if left <= 0.0:
            raise Unsolved("kTimeLimit", "Time limit reached", tried)
        if np.isfinite(left):
            # The limit is on all that this solver has run.
            solver.setOptionValue("time_limit", solver.getRunTime() + left)
        solver.run()
        status = solver.getModelStatus()
        if status in _ENDLESS and self.added:
            # From where it was, the primal simplex now and then takes a far bound for none: only a fresh start proves it.
            self._afresh()
            solver.run()
            status = solver.getModelStatus()
        if status in _ENDLESS:
            return False
        if status != highspy.HighsModelStatus.kOptimal:
            raise Unsolved(status.name, solver.modelStatusToString(status), tried)
        return True

    def _afresh(self) -> None:
        self.solver.clearSolver()
        self.solver.setOptionValue("simplex_strategy", 1)

    def _broken(self, shift_s: Array) -> bool:
        """Whether shifts break arcs that are not in the solver yet; those are put there."""
        out = np.flatnonzero(~self.near)
        if not len(out):
            return False
        at = np.append(shift_s, 0.0)
        new = out[self.few.least_s[out] - at[self.few.later[out]] + at[self.few.earlier[out]] > TOLERANCE]
        if not len(new):
            return False
        # Where many are broken, all of them solved from the start take less time than a step for each.
        many = len(new) > MANY * self.nodes
        new = out if many else new
        self.near[new] = True
        self.place[new] = self.columns + np.arange(len(new))
        some = _picked(self.few, new)
        self._columns(between(some.later, some.earlier, self.nodes), some.least_s, some.lowest, self.most_of[new])
        self.added = True
        if many:
            self._afresh()
        else:
            self.solver.setOptionValue("simplex_strategy", 4)
        return True


def _picked(arcs: Arcs, chosen: Index) -> Arcs:
    return Arcs(arcs.later[chosen], arcs.earlier[chosen], arcs.least_s[chosen], arcs.lowest[chosen], arcs.most[chosen])


def _near(arcs: Arcs, nodes: int) -> NDArray[np.bool_]:
    """(C,) which arcs a large circulation begins with: all costs, and of the others those that are nearest to be broken.

    Only where most costs are of one moment against another: what is late by the clock makes all that follows late too, and
    so breaks as much of what seemed far.
    """
    one_way = np.flatnonzero(arcs.lowest >= 0.0)
    most = round(NEAR * nodes)
    against = arcs.earlier[arcs.lowest < 0.0] >= 0
    if nodes < LARGE or len(one_way) <= 2 * most or 2 * np.count_nonzero(against) <= len(against):
        return np.ones(len(arcs.least_s), dtype=bool)
    bound = np.partition(arcs.least_s[one_way], len(one_way) - most)[len(one_way) - most]
    return (arcs.lowest < 0.0) | (arcs.least_s > min(bound, 0.0))


def circulate(arcs: Arcs, wide: Wide, nodes: int, budget: Budget = ENDLESS) -> tuple[Array, Array, Array] | None:
    """The forces of arcs (C,) and wide rows (W,) and the shifts (nodes,) at the optimum; None where no shifts keep the rows.

    Raises Unsolved where HiGHS fails or runs past its budget.
    """
    return Circulation(arcs, wide, nodes).solve(budget)


def quiet() -> "Quiet":
    """A solver with the options that are used throughout: one thread, the same steps every time."""
    solver = Quiet()
    for name, value in (
        ("primal_feasibility_tolerance", TOLERANCE), ("dual_feasibility_tolerance", TOLERANCE), ("solver", "simplex"),
        ("simplex_strategy", 1), ("presolve", "off"), ("threads", 1), ("parallel", "off"), ("random_seed", 0),
    ):  # fmt: skip
        solver.setOptionValue(name, value)
    return solver


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
