"""The only door to HiGHS: linear programs with column generation, small 0/1 programs."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import highspy
import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix

Floats = NDArray[np.float64]

INFINITY = highspy.kHighsInf


class LinearStatus(StrEnum):
    """The closed set of outcomes."""

    OPTIMAL = "optimal"
    INFEASIBLE = "infeasible"
    UNBOUNDED = "unbounded"
    STOPPED = "stopped"


_STATUS = {
    highspy.HighsModelStatus.kOptimal: LinearStatus.OPTIMAL,
    highspy.HighsModelStatus.kInfeasible: LinearStatus.INFEASIBLE,
    highspy.HighsModelStatus.kUnboundedOrInfeasible: LinearStatus.INFEASIBLE,
    highspy.HighsModelStatus.kUnbounded: LinearStatus.UNBOUNDED,
}


@dataclass(frozen=True)
class LinearAnswer:
    """status; value (maximised); x per column; dual per row (sensitivity of the maximum)."""

    status: LinearStatus
    value: float
    x: Floats
    dual: Floats


class _Quiet(highspy.Highs):
    """HiGHS without callbacks: switching them on prints a banner, and none is used here."""

    def enableCallbacks(self) -> None:
        """Leave them off."""


def _solver() -> highspy.Highs:
    solver = _Quiet()  # type: ignore[no-untyped-call]
    solver.setOptionValue("output_flag", False)
    solver.setOptionValue("threads", 1)
    return solver


def _answer(solver: highspy.Highs) -> LinearAnswer:
    status = _STATUS.get(solver.getModelStatus(), LinearStatus.STOPPED)
    if status is not LinearStatus.OPTIMAL:
        return LinearAnswer(status, np.nan, np.zeros(0), np.zeros(0))
    solution = solver.getSolution()
    value = float(solver.getInfo().objective_function_value)
    return LinearAnswer(status, value, np.array(solution.col_value), np.array(solution.row_dual))


def _model(
    cost: Floats, lower: Floats, upper: Floats, matrix: Floats, row_lower: Floats, row_upper: Floats
) -> highspy.HighsLp:
    model = highspy.HighsLp()
    sparse = csc_matrix(matrix)
    model.num_col_, model.num_row_ = cost.size, row_lower.size
    model.col_cost_, model.col_lower_, model.col_upper_ = cost, lower, upper
    model.row_lower_, model.row_upper_ = row_lower, row_upper
    model.a_matrix_.format_ = highspy.MatrixFormat.kColwise
    model.a_matrix_.start_, model.a_matrix_.index_ = sparse.indptr, sparse.indices
    model.a_matrix_.value_ = sparse.data
    model.sense_ = highspy.ObjSense.kMaximize
    return model


class LinearProgram:
    """max cost'x, row_lower <= A x <= row_upper, lower <= x <= upper; columns and costs may change later."""

    def __init__(
        self,
        cost: Floats,
        lower: Floats,
        upper: Floats,
        matrix: Floats,
        row_lower: Floats,
        row_upper: Floats,
    ) -> None:
        self._solver = _solver()
        self._solver.passModel(_model(cost, lower, upper, matrix, row_lower, row_upper))

    def add_columns(self, cost: Floats, matrix: Floats) -> None:
        """New columns (rows x n) bounded below by 0."""
        for k in range(cost.size):
            rows = np.flatnonzero(matrix[:, k]).astype(np.int32)
            self._solver.addCol(float(cost[k]), 0.0, INFINITY, rows.size, rows, matrix[rows, k])

    def set_costs(self, cost: Floats) -> None:
        """Replace all costs."""
        self._solver.changeColsCost(cost.size, np.arange(cost.size, dtype=np.int32), cost)

    def solve(self) -> LinearAnswer:
        """Run from where the last run ended."""
        self._solver.run()
        return _answer(self._solver)


def solve_binary(
    cost: Floats,
    matrix: Floats,
    row_lower: Floats,
    row_upper: Floats,
    upper: Floats,
    seconds: float,
    gap: float,
) -> LinearAnswer:
    """max cost'x over x in {0, 1}, x <= upper, row_lower <= A x <= row_upper."""
    solver = _solver()
    model = _model(cost, np.zeros(cost.size), upper, matrix, row_lower, row_upper)
    model.integrality_ = [highspy.HighsVarType.kInteger] * cost.size
    solver.passModel(model)
    solver.setOptionValue("time_limit", seconds)
    solver.setOptionValue("mip_rel_gap", gap)
    solver.run()
    return _answer(solver)
