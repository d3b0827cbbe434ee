"""A part of a model in SCIP: columns fixed at 0 left out, the rest as it stands, cuts on top."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from hubdesign.model.program import Program
from hubdesign.solve.carrier.setting import RowSet, Setting
from hubdesign.solve.control import Control
from hubdesign.solve.scip import MipEnd, ScipModel

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: Up to this many pool rows outside the LP are handed to SCIP to separate by itself.
_LAZY_ROWS = 8_000


class Restricted:
    """The problem of `setting` within `lower` and `upper`, with rows on top, in SCIP.

    `rows` are pool rows and cuts; the rows of the model are there in any case.
    """

    def __init__(self, setting: Setting, lower: Floats, upper: Floats, rows: RowSet) -> None:
        self.setting = setting
        upper = setting.follow(upper)
        self.columns = np.flatnonzero((upper > 0.0) | (lower > 0.0))
        program = Program()
        program.add_columns(
            "column",
            lower[self.columns],
            upper[self.columns],
            integer=False,
            label=lambda member: setting.program.name_of(int(self.columns[member])),
        )
        program._integer = [setting.program.integer[self.columns]]
        for block in setting.base_rows:
            self._add_rows(program, *block)
        added = self._cut_down(*rows)
        lazy = self._cut_down(*setting.pool_rows)
        extra = [lazy] if lazy[0].shape[0] <= _LAZY_ROWS else []
        self.program = program
        self.scip = ScipModel(program, setting.objective.coefficients[self.columns], [added], extra)

    def _cut_down(
        self, matrix: sparse.csr_array, lower: Floats, upper: Floats
    ) -> tuple[sparse.csr_array, Floats, Floats]:
        """Return the rows over the columns left, without those that nothing can violate."""
        part = sparse.csr_array(matrix[:, self.columns])
        positive = part.multiply(part > 0).sum(axis=1)
        # With all columns at least 0: a row without positive entries holds an upper side >= 0.
        size = np.diff(part.indptr)
        low = np.where(np.isfinite(lower), lower, -np.inf)
        matters = (size > 0) & ~((low == -np.inf) & (upper >= 0.0) & (positive <= 0.0))
        keep = np.flatnonzero(matters)
        return sparse.csr_array(part[keep]), lower[keep], upper[keep]

    def _add_rows(self, program: Program, matrix: sparse.csr_array, lower: Floats, upper: Floats) -> None:
        part, low, high = self._cut_down(matrix, lower, upper)
        entries = part.tocoo()
        program.rows.add("row", entries.row, entries.col, entries.data, low, high, str)

    def add_start(self, point: Floats) -> bool:
        """Offer a full point of the whole model as the start."""
        return self.scip.add_start(point[self.columns])

    def set_priorities(self, priority: Floats) -> None:
        """Set SCIP's branching priorities from those of all columns, shape (columns,)."""
        for column, variable in zip(self.columns.tolist(), self.scip.variables):
            if priority[column]:
                self.scip.scip.chgVarBranchPriority(variable, int(priority[column]))

    def run(
        self,
        control: Control,
        *,
        gap: float = 0.0,
        node_limit: int | None = None,
        objective_limit: float | None = None,
        on_plan: Callable[[Floats], None] | None = None,
        on_bound: Callable[[float], None] | None = None,
        settings: dict[str, Any] | None = None,
    ) -> MipEnd:
        """Solve; plans come as points of the whole model."""
        hear = None if on_plan is None else (lambda values: on_plan(self.whole(values)))
        return self.scip.run(
            control,
            gap=gap,
            node_limit=node_limit,
            objective_limit=objective_limit,
            on_plan=hear,
            on_bound=on_bound,
            settings=settings,
        )

    def resume(self, total_nodes: int, objective_limit: float) -> MipEnd:
        """Go on where :meth:`run` stopped, up to `total_nodes` nodes in all."""
        scip = self.scip.scip
        if np.isfinite(objective_limit) and objective_limit < scip.getObjlimit():
            scip.setObjlimit(objective_limit)
        scip.setParam("limits/totalnodes", total_nodes)
        remaining = max(0.01, self.setting.control.remaining_s())
        scip.setParam("limits/time", min(1e20, scip.getSolvingTime() + remaining))
        with self.setting.control.interrupting(self.scip.interrupt):
            scip.optimizeNogil()
        return self.scip._end(scip.getObjlimit())

    def nodes(self) -> int:
        """Return the nodes that SCIP has solved in all."""
        return int(self.scip.scip.getNTotalNodes())

    def interrupt(self) -> None:
        """Have SCIP stop."""
        self.scip.interrupt()

    def free(self) -> None:
        """Give SCIP's memory back."""
        self.scip.scip.freeProb()

    def whole(self, values: Floats) -> Floats:
        """Return the point of the whole model of a point of this one."""
        result = np.zeros(self.setting.program.column_count)
        result[self.columns] = values
        return result
