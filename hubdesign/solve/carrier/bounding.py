"""Solving a node: warm LP, violated rows, cuts, columns that price in, and a bound from its duals."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from hubdesign.solve.carrier.linear import LinearModel, rows_among
from hubdesign.solve.carrier.setting import RowSet, Setting
from hubdesign.solve.relaxation import LpStatus

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: Most rows a round may add.
_MOST_POOL = 20_000
_MOST_CUTS = 3_000

#: A column prices in where its reduced cost (scaled objective a share) is below minus this.
_PRICE_FLOOR = 1e-6

#: Rounds after the last separation in which columns may still price in.
_PRICING_ROUNDS = 6

#: Columns priced in per demand and round.
_COLUMNS_EACH = 2

#: A round with more new rows than this is solved by interior point and crossover, not by dual simplex.
_INTERIOR_ROWS = 500
INTERIOR_SIZE = 6000


@dataclass(frozen=True, slots=True)
class NodeEnd:
    """How a node ended; `bound` (scaled) is proven by duals, inf where the node holds no plan."""

    status: LpStatus
    bound: float


class Bounder:
    """Rounds of separation and pricing on one LP, under changing bounds of its integer columns."""

    def __init__(self, setting: Setting, lp: LinearModel) -> None:
        self.setting, self.lp = setting, lp
        self.lower, self.upper = lp.lower.copy(), lp.upper.copy()
        self.open_upper = setting.follow(self.upper)
        self._fixings: dict[int, tuple[float, float]] = {}

    def fix(self, fixings: dict[int, tuple[float, float]]) -> None:
        """Put the bounds of a node in place of those of the last one."""
        columns = np.array(sorted(fixings), dtype=np.int64)
        self.lower, self.upper = self.lp.lower.copy(), self.lp.upper.copy()
        for column in columns.tolist():
            self.lower[column], self.upper[column] = fixings[column]
        touched = np.array(sorted({*fixings, *self._fixings}), dtype=np.int64)
        self.lp.set_bounds(touched, self.lower[touched], self.upper[touched])
        self._fixings = dict(fixings)
        self.open_upper = self.setting.follow(self.upper)

    def rounds(
        self,
        most: int,
        *,
        least_gain: float,
        enough: Callable[[], float] = lambda: np.inf,
        on_round: Callable[[float], None] | None = None,
        idle: int = 2,
        patience: int = 1,
    ) -> NodeEnd:
        """Separate and price until it is `enough` or `patience` rounds gain less than `least_gain` each.

        `on_round` hears of every proven bound.
        """
        setting, lp = self.setting, self.lp
        best, last, weak = -np.inf, -np.inf, 0
        interior: bool | None = True if lp.row_count > INTERIOR_SIZE else None
        for count in range(most + _PRICING_ROUNDS):
            status = lp.solve(setting.control.remaining_s(), interior=interior)
            if status is LpStatus.INFEASIBLE:
                return self._infeasible(best)
            if status is not LpStatus.OPTIMAL:
                return NodeEnd(status, best)
            value = lp.objective
            bound, reduced = lp.dual_bound(self.lower, self.open_upper, setting.groups)
            best = max(best, bound)
            if on_round is not None:
                on_round(best)
            weak = weak + 1 if value - last < least_gain * abs(value) else 0
            last = value
            done = count >= most or weak >= patience or best >= enough() or setting.control.stop_requested()
            new = self._missing(reduced) if done or count >= 2 else self._missing(reduced)[:0]
            added = 0 if done else self._separate()
            lp.add_columns(new)
            if not added and not len(new):
                break
            if count:
                lp.drop_idle_rows(idle)
            interior = added > _INTERIOR_ROWS and lp.row_count > INTERIOR_SIZE
        return NodeEnd(LpStatus.OPTIMAL, best)

    def _infeasible(self, best: float) -> NodeEnd:
        """Return the end of a node without a solution; columns left out could still save it."""
        lp = self.lp
        missing = np.flatnonzero((self.open_upper > 0.0) & (lp.place < 0))
        if not len(missing):
            return NodeEnd(LpStatus.INFEASIBLE, np.inf)
        lp.add_columns(missing)
        status = lp.solve(self.setting.control.remaining_s())
        if status is LpStatus.INFEASIBLE:
            return NodeEnd(status, np.inf)
        if status is LpStatus.OPTIMAL:
            best = max(best, lp.dual_bound(self.lower, self.open_upper, self.setting.groups)[0])
        return NodeEnd(status, best)

    def _separate(self) -> int:
        """Add violated pool rows and cuts of the last solution; return how many."""
        lp, maker = self.lp, self.setting.cuts
        rows = lp.violated(lp.values, _MOST_POOL)
        cuts = maker.rows(maker.link_cuts(lp.values) + maker.station_cuts(lp.values), _MOST_CUTS)
        lp.add_pool_rows(rows)
        lp.add_cuts(cuts)
        return len(rows) + len(cuts)

    def _missing(self, reduced: Floats) -> Ints:
        """Return columns outside the LP that price in, the best of each demand."""
        lp, setting = self.lp, self.setting
        found = np.flatnonzero((lp.place < 0) & (self.open_upper > 0.0) & (reduced < -_PRICE_FLOOR))
        if not len(found):
            return found
        demand = setting.groups[found]
        order = np.lexsort((reduced[found], demand))
        found, demand = found[order], demand[order]
        starts = np.flatnonzero(np.concatenate(([True], demand[1:] != demand[:-1])))
        rank = np.arange(len(found)) - np.repeat(starts, np.diff(np.append(starts, len(found))))
        return np.asarray(found[rank < _COLUMNS_EACH], dtype=np.int64)


def sub_lp(setting: Setting, rows: RowSet, lower: Floats, upper: Floats) -> LinearModel:
    """Return an LP of the problem within tighter bounds: columns and rows that these shut are left out.

    `rows` are valid rows to start from (pool rows and cuts).
    """
    upper = setting.follow(upper)
    active = setting.start_columns(upper)
    lp = LinearModel(
        setting.program,
        setting.objective.coefficients,
        active,
        lower,
        upper,
        setting.held,
        seed=setting.control.seed,
    )
    matrix, low, high = rows
    alive = rows_among(matrix, upper > 0.0, 2)
    lp.add_row_set(sparse.csr_array(matrix[alive]), low[alive], high[alive])
    return lp
