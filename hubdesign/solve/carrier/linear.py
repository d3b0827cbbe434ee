"""The warm linear relaxation of a carrier model: chosen columns, rows as they are violated, cuts.

Columns that are not in the LP stand at 0. Whoever leaves columns out owes the proof that none of them is
missed (:meth:`LinearModel.price`) before the LP's value may be called a bound.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from hubdesign.model.program import Program
from hubdesign.solve.highs import build_lp, finite, new_highs
from hubdesign.solve.relaxation import LpStatus

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

#: Pool rows violated by less than this (in shares) are left out.
VIOLATION = 1e-3

#: Rows of the pool and cuts that were slack in this many solves in a row leave the LP.
_SLACK_ROUNDS = 6

#: From this many rows on, a first solve goes by interior point and crossover: several times faster.
_INTERIOR_ROWS = 4000


@dataclass(frozen=True, slots=True)
class CutRows:
    """Valid rows ``matrix @ columns >= lower`` over all columns of the program."""

    matrix: sparse.csr_array
    lower: Floats

    def __len__(self) -> int:
        return len(self.lower)


class LinearModel:
    """Rows of `program` over the columns `active`, in HiGHS.

    Parameters
    ----------
    program
        Columns, rows and pool.
    coefficients
        Objective to be minimised, shape (columns,).
    active
        Columns of the LP, shape (columns,); the others stand at 0.
    lower, upper
        Bounds of all columns, shape (columns,).
    extra
        Further rows (matrix over all columns, lower, upper) that always hold.
    """

    def __init__(
        self,
        program: Program,
        coefficients: Floats,
        active: Bools,
        lower: Floats,
        upper: Floats,
        extra: tuple[tuple[sparse.csr_array, Floats, Floats], ...] = (),
        *,
        seed: int = 1,
    ) -> None:
        import highspy

        self._highspy: Any = highspy
        self.program = program
        self.coefficients = coefficients
        self.lower, self.upper = lower, upper
        count = program.column_count
        blocks = [(program.rows.matrix(count), program.rows.lower, program.rows.upper), *extra]
        base = sparse.csr_array(sparse.vstack([block[0] for block in blocks], format="csr"))
        low = np.concatenate([block[1] for block in blocks])
        high = np.concatenate([block[2] for block in blocks])
        # A row whose columns all stand at 0, and that 0 satisfies, says nothing.
        alive = _entries(base) @ ((lower != 0.0) | (upper != 0.0)).astype(np.float64) > 0.0
        kept = np.flatnonzero(alive | (low > 0.0) | (high < 0.0))
        self.base, self.base_lower, self.base_upper = sparse.csr_array(base[kept]), low[kept], high[kept]
        self.pool = program.pool.matrix(count)
        self.pool_lower, self.pool_upper = program.pool.lower, program.pool.upper
        self.pool_in = np.zeros(program.pool.count, dtype=bool)
        self.seed = seed
        self._start(active)

    def _start(self, active: Bools) -> None:
        self.columns = np.flatnonzero(active)  # in LP order
        self.place = np.full(self.program.column_count, -1, dtype=np.int64)
        self.place[self.columns] = np.arange(len(self.columns))
        # Rows beyond the base, in LP order: pool position (-1 for a cut) and coefficients.
        self._added: list[sparse.csr_array] = []
        self._added_pool = np.zeros(0, dtype=np.int64)
        self._added_lower = np.zeros(0)
        self._added_upper = np.zeros(0)
        self._idle = np.zeros(0, dtype=np.int64)
        self.highs = new_highs(seed=self.seed)
        columns = (self.lower[self.columns], self.upper[self.columns])
        base = sparse.csr_array(self.base[:, self.columns])
        rows = (self.base_lower, self.base_upper)
        self.highs.passModel(build_lp(base, self.coefficients[self.columns], columns, rows))
        self.values: Floats = np.zeros(self.program.column_count)
        self.objective = -np.inf
        self.solved = False
        self._duals: Floats = np.zeros(len(self.base_lower))

    # -- rows and columns ------------------------------------------------------------------------------

    @property
    def row_count(self) -> int:
        """Rows in the LP."""
        return len(self.base_lower) + len(self._added_lower)

    def violated(self, values: Floats, most: int, *, least: float = VIOLATION) -> Ints:
        """Return the pool rows that `values` violate and that are not in yet, worst first."""
        activity = self.pool @ values
        excess = np.maximum(activity - self.pool_upper, self.pool_lower - activity)
        found = np.flatnonzero((excess > least) & ~self.pool_in)
        order = np.argsort(-excess[found], kind="stable")
        return np.asarray(found[order][:most], dtype=np.int64)

    def add_pool_rows(self, rows: Ints) -> None:
        """Put pool rows into the LP."""
        if len(rows):
            self.pool_in[rows] = True
            self._add(
                sparse.csr_array(self.pool[rows]),
                self.pool_lower[rows],
                self.pool_upper[rows],
                np.asarray(rows, dtype=np.int64),
            )

    def add_cuts(self, cuts: CutRows) -> None:
        """Put cuts into the LP."""
        if len(cuts):
            count = len(cuts)
            self._add(cuts.matrix, cuts.lower, np.full(count, np.inf), np.full(count, -1, dtype=np.int64))

    def _add(self, matrix: sparse.csr_array, lower: Floats, upper: Floats, pool: Ints) -> None:
        inside = sparse.csr_array(matrix[:, self.columns])
        self.highs.addRows(
            matrix.shape[0],
            finite(lower),
            finite(upper),
            inside.nnz,
            inside.indptr[:-1].astype(np.int32),
            inside.indices.astype(np.int32),
            inside.data,
        )
        self._added.append(matrix)
        self._added_pool = np.concatenate((self._added_pool, pool))
        self._added_lower = np.concatenate((self._added_lower, lower))
        self._added_upper = np.concatenate((self._added_upper, upper))
        self._idle = np.concatenate((self._idle, np.zeros(len(lower), dtype=np.int64)))

    def added(self) -> tuple[sparse.csr_array, Floats, Floats]:
        """Return pool rows and cuts in the LP (matrix over all columns, lower, upper)."""
        if not self._added:
            empty = sparse.csr_array((0, self.program.column_count))
            return empty, np.zeros(0), np.zeros(0)
        if len(self._added) > 1:
            self._added = [sparse.csr_array(sparse.vstack(self._added, format="csr"))]
        return self._added[0], self._added_lower, self._added_upper

    def tight(self) -> tuple[sparse.csr_array, Floats, Floats]:
        """Return those of :meth:`added` that the last optimum meets with equality."""
        matrix, lower, upper = self.added()
        activity = matrix @ self.values
        rows = np.flatnonzero(np.minimum(activity - lower, upper - activity) <= 1e-6)
        return sparse.csr_array(matrix[rows]), lower[rows], upper[rows]

    def add_columns(self, new: Ints) -> None:
        """Put columns into the LP, with their entries in every row."""
        if not len(new):
            return
        whole = sparse.vstack([self.base, self.added()[0]], format="csr")
        part = sparse.csc_array(sparse.csr_array(whole)[:, new])
        self.highs.addCols(
            len(new),
            self.coefficients[new],
            self.lower[new],
            finite(self.upper[new]),
            part.nnz,
            part.indptr[:-1].astype(np.int32),
            part.indices.astype(np.int32),
            part.data,
        )
        self.place[new] = len(self.columns) + np.arange(len(new))
        self.columns = np.concatenate((self.columns, new))

    def add_row_set(self, matrix: sparse.csr_array, lower: Floats, upper: Floats) -> None:
        """Put valid rows over all columns into the LP."""
        if len(lower):
            self._add(matrix, lower, upper, np.full(len(lower), -1, dtype=np.int64))

    def drop_idle_rows(self, rounds: int = _SLACK_ROUNDS) -> int:
        """Take out pool rows and cuts that were slack in the last `rounds` solves; return how many."""
        leaving = np.flatnonzero(self._idle >= rounds)
        if len(leaving) < 200:
            return 0
        basis = self.highs.getBasis()
        matrix, lower, upper = self.added()
        stays = np.ones(len(lower), dtype=bool)
        stays[leaving] = False
        first = len(self.base_lower)
        self.pool_in[self._added_pool[leaving][self._added_pool[leaving] >= 0]] = False
        rows = list(basis.row_status)
        basis.row_status = rows[:first] + [rows[first + r] for r in np.flatnonzero(stays).tolist()]
        self.highs.deleteRows(len(leaving), (leaving + first).astype(np.int32))
        self.highs.setBasis(basis)
        self._added = [sparse.csr_array(matrix[np.flatnonzero(stays)])]
        self._added_pool, self._idle = self._added_pool[stays], self._idle[stays]
        self._added_lower, self._added_upper = lower[stays], upper[stays]
        return len(leaving)

    def set_bounds(self, columns: Ints, lower: Floats, upper: Floats) -> None:
        """Change the bounds of active `columns`."""
        place = self.place[columns]
        if len(columns):
            self.highs.changeColsBounds(
                len(columns),
                place.astype(np.int32),
                np.asarray(lower, dtype=np.float64),
                finite(np.asarray(upper, dtype=np.float64)),
            )

    # -- solving ---------------------------------------------------------------------------------------

    def solve(self, time_limit_s: float | None = None, *, interior: bool | None = None) -> LpStatus:
        """Solve and keep `values` and `objective` of an optimal end.

        `interior` forces interior point and crossover; None leaves the choice to size and warmth.
        """
        if interior is None:
            interior = not self.solved and self.row_count >= _INTERIOR_ROWS
        if interior:
            self.highs.clearSolver()
        self.highs.setOptionValue("solver", "ipm" if interior else "simplex")
        if time_limit_s is not None:
            self.highs.setOptionValue("time_limit", self.highs.getRunTime() + max(0.01, time_limit_s))
        self.highs.run()
        status = self.highs.getModelStatus()
        kinds = self._highspy.HighsModelStatus
        if status == kinds.kOptimal:
            self.solved = True
            self._read()
            return LpStatus.OPTIMAL
        if status == kinds.kInfeasible:
            self.solved = True
            return LpStatus.INFEASIBLE
        if status in (kinds.kUnbounded, kinds.kUnboundedOrInfeasible):
            return LpStatus.UNBOUNDED
        return LpStatus.LIMIT

    def _read(self) -> None:
        solution = self.highs.getSolution()
        self.values = np.zeros(self.program.column_count)
        self.values[self.columns] = np.asarray(solution.col_value, dtype=np.float64)
        self._duals = np.asarray(solution.row_dual, dtype=np.float64)
        self.objective = float(self.highs.getInfo().objective_function_value)
        first = len(self.base_lower)
        if len(self._added_lower):
            activity = np.asarray(solution.row_value, dtype=np.float64)[first:]
            room = np.minimum(activity - self._added_lower, self._added_upper - activity)
            self._idle = np.where(room > 1e-7, self._idle + 1, 0)

    def dual_bound(self, lower: Floats, upper: Floats, groups: Ints) -> tuple[float, Floats]:
        """Return a bound from the last duals alone, and the reduced cost of every column.

        For any multipliers ``m`` of the rows, ``m . (active sides) + sum_j min(r_j l_j, r_j u_j)`` with
        ``r = c - A' m`` bounds the optimum from below, columns outside the LP included (Neumaier and
        Shcherbina 2004, Mathematical Programming 99:283-296): no tolerance of the LP solver enters. The flow
        columns and the unserved share of a demand sum to 1 (row 1), so each group counts with its smallest
        reduced cost only.

        Parameters
        ----------
        lower, upper
            Bounds of all columns at this node, shape (columns,).
        groups
            Demand of each flow and unserved column, -1 for the others, shape (columns,).
        """
        first = len(self.base_lower)
        matrix, added_lower, added_upper = self.added()
        duals = self._duals
        left = np.concatenate((self.base_lower, added_lower))
        right = np.concatenate((self.base_upper, added_upper))
        duals = np.where(np.isfinite(np.where(duals > 0.0, left, right)), duals, 0.0)
        reduced = self.coefficients - self.base.T @ duals[:first]
        if len(added_lower):
            reduced = reduced - matrix.T @ duals[first:]
        sides = np.where(duals > 0.0, left, np.where(duals < 0.0, right, 0.0))
        total = float(duals @ sides)
        single = groups < 0
        r, low, high = reduced[single], lower[single], upper[single]
        total += float(np.where(r < 0.0, r * np.minimum(high, 1e30), r * low).sum())
        worst = np.zeros(int(groups.max(initial=-1)) + 1)
        shared = np.flatnonzero(~single & (upper > 0.0))
        np.minimum.at(worst, groups[shared], reduced[shared])
        return total + float(worst.sum()), reduced

    def copy(self) -> LinearModel:
        """Return an independent LP with the same columns, rows and basis."""
        twin = object.__new__(LinearModel)
        twin.__dict__.update(self.__dict__)
        twin._added = list(self._added)
        twin.pool_in, twin.place = self.pool_in.copy(), self.place.copy()
        twin.highs = new_highs(seed=self.seed)
        twin.highs.passModel(self.highs.getLp())
        if self.solved:
            twin.highs.setBasis(self.highs.getBasis())
        return twin


def _entries(matrix: sparse.csr_array) -> sparse.csr_array:
    """Return a matrix of ones where `matrix` has an entry."""
    return sparse.csr_array((np.ones(matrix.nnz), matrix.indices, matrix.indptr), shape=matrix.shape)


def rows_among(matrix: sparse.csr_array, columns: Bools, least: int) -> Ints:
    """Return the rows with at least `least` entries in `columns` (a mask)."""
    return np.flatnonzero(_entries(matrix) @ columns.astype(np.float64) > least - 0.5)
