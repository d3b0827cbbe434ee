"""The linear relaxation of a Program in HiGHS: one warm model, rows added as they are violated.

HiGHS (MIT licence) earns its place here: SCIP's own LP does not finish these roots (DEVELOPERS.md).
"""

from __future__ import annotations

import enum
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from hubdesign.model.program import Program
from hubdesign.solve.highs import build_lp, finite, new_highs

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: A pool row violated by less than this (in shares) is left out.
VIOLATION = 1e-4


class LpStatus(enum.Enum):
    """How an LP solve ended."""

    OPTIMAL = "optimal"
    INFEASIBLE = "infeasible"
    LIMIT = "limit"
    UNBOUNDED = "unbounded"


class Relaxation:
    """Rows of `program` in HiGHS, its pool separated on demand.

    Parameters
    ----------
    program
        Columns, rows and pool.
    coefficients
        Objective to be minimised, shape (columns,).
    threads, seed
        As HiGHS takes them.
    """

    def __init__(self, program: Program, coefficients: Floats, *, threads: int = 1, seed: int = 1) -> None:
        import highspy

        self.program = program
        self.pool = program.pool.matrix(program.column_count)
        self._pool_lower, self._pool_upper = program.pool.lower, program.pool.upper
        self.pool_in = np.zeros(program.pool.count, dtype=bool)
        self._highspy: Any = highspy
        self.highs = new_highs(threads=threads, seed=seed)
        rows = program.rows
        matrix = rows.matrix(program.column_count)
        columns = (program.lower, program.upper)
        self.highs.passModel(build_lp(matrix, coefficients, columns, (rows.lower, rows.upper)))
        self.values: Floats = np.zeros(program.column_count)
        self.objective = -np.inf
        self._coefficients = coefficients
        self._bounds = [program.lower, program.upper]
        self._blocks = [(matrix, rows.lower, rows.upper)]

    def solve(self, time_limit_s: float | None = None) -> LpStatus:
        """Solve warm and keep `values` and `objective` of an optimal end.

        The limit counts from now, wall s; after it the old values stand.
        """
        if time_limit_s is not None:
            self.highs.setOptionValue("time_limit", self.highs.getRunTime() + max(0.01, time_limit_s))
        self.highs.run()
        status = self.highs.getModelStatus()
        kinds = self._highspy.HighsModelStatus
        if status == kinds.kOptimal or status == kinds.kModelEmpty:
            solution = self.highs.getSolution()
            self.values = np.asarray(solution.col_value, dtype=np.float64)
            self.objective = float(self.highs.getInfo().objective_function_value)
            return LpStatus.OPTIMAL
        if status == kinds.kInfeasible:
            return LpStatus.INFEASIBLE
        if status in (kinds.kUnbounded, kinds.kUnboundedOrInfeasible):
            return LpStatus.UNBOUNDED
        return LpStatus.LIMIT

    def reduced_costs(self) -> Floats:
        """Return the reduced cost of each column at the last optimum, shape (columns,)."""
        return np.asarray(self.highs.getSolution().col_dual, dtype=np.float64)

    def row_duals(self) -> Floats:
        """Return the dual of each row in the LP at the last optimum."""
        return np.asarray(self.highs.getSolution().row_dual, dtype=np.float64)

    def violated(self, values: Floats, most: int = 5000) -> Ints:
        """Return the pool rows that `values` violate and that are not in yet, worst first."""
        activity = self.pool @ values
        excess = np.maximum(activity - self._pool_upper, self._pool_lower - activity)
        found = np.flatnonzero((excess > VIOLATION) & ~self.pool_in)
        order = np.argsort(-excess[found], kind="stable")
        return np.asarray(found[order][:most], dtype=np.int64)

    def add_pool_rows(self, rows: Ints) -> None:
        """Put pool rows into the LP."""
        self.pool_in[rows] = True
        chosen = sparse.csr_array(self.pool[rows])
        self.add_rows(chosen, self._pool_lower[rows], self._pool_upper[rows])

    def add_rows(self, matrix: sparse.csr_array, lower: Floats, upper: Floats) -> None:
        """Put rows ``lower <= matrix @ columns <= upper`` into the LP."""
        if matrix.shape[0] == 0:
            return
        self.highs.addRows(
            matrix.shape[0],
            finite(np.asarray(lower, dtype=np.float64)),
            finite(np.asarray(upper, dtype=np.float64)),
            matrix.nnz,
            matrix.indptr[:-1].astype(np.int32),
            matrix.indices.astype(np.int32),
            np.asarray(matrix.data, dtype=np.float64),
        )
        self._blocks.append((matrix, lower, upper))

    def set_bounds(self, columns: Ints, lower: Floats, upper: Floats) -> None:
        """Change the bounds of `columns`."""
        if len(columns):
            self._bounds[0][columns], self._bounds[1][columns] = lower, upper
            self.highs.changeColsBounds(
                len(columns),
                np.asarray(columns, dtype=np.int32),
                np.asarray(lower, dtype=np.float64),
                finite(np.asarray(upper, dtype=np.float64)),
            )

    def safe_bound(self) -> float:
        """Return a lower bound on the LP's optimum that holds whatever the solver's tolerances did.

        For any multipliers y, ``sum_i (y_i lower_i if y_i > 0 else y_i upper_i)`` plus, for each column, the
        least of its reduced cost ``c - A'y`` times its bounds is a bound (weak duality; Neumaier and
        Shcherbina 2004, Math. Programming 99:283-296). Multipliers on a missing side count as 0.
        """
        duals = self.row_duals()
        reduced = self._coefficients.copy()
        total, first = 0.0, 0
        for matrix, lower, upper in self._blocks:
            y = duals[first : first + matrix.shape[0]]
            first += matrix.shape[0]
            y = np.where((y > 0) & ~np.isfinite(lower), 0.0, np.where((y < 0) & ~np.isfinite(upper), 0.0, y))
            side = np.where(y > 0, lower, upper)
            total += float((y[y != 0.0] * side[y != 0.0]).sum())
            reduced -= matrix.T @ y
        low, high = self._bounds
        at_best = np.where(reduced > 0, low, high)
        used = reduced != 0.0
        return total + float((reduced[used] * at_best[used]).sum())

    def separate(self, time_limit_s: float | None = None, rounds: int = 200) -> LpStatus:
        """Solve and add violated pool rows until none is left; `values` are then those of the strong LP."""
        status = self.solve(time_limit_s)
        for _ in range(rounds):
            if status is not LpStatus.OPTIMAL:
                return status
            rows = self.violated(self.values)
            if not len(rows):
                return status
            self.add_pool_rows(rows)
            status = self.solve(time_limit_s)
        return status
