"""A Program in SCIP: loading, starting plans, interruption, progress; SCIP's words are translated here."""

from __future__ import annotations

import enum
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from hubdesign.model.program import Program
from hubdesign.solve.control import Control

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]

#: SCIP's infinity; a dual bound of this size is none.
SCIP_INFINITY = 1e20

RowSet = tuple[sparse.csr_array, Floats, Floats]


class MipStatus(enum.Enum):
    """How SCIP ended."""

    OPTIMAL = "optimal"  #: within the gap limit
    INFEASIBLE = "infeasible"
    LIMIT = "limit"  #: time, nodes or interruption


@dataclass(frozen=True, slots=True)
class MipEnd:
    """The end of a run: status, best point (None without one), scaled objective and dual bound.

    `bound` is -inf where SCIP has none; under an objective limit an infeasible end proves the limit.
    """

    status: MipStatus
    values: Floats | None
    objective: float
    bound: float


class ScipModel:
    """`program` with `coefficients` to be minimised, and some extra rows.

    Parameters
    ----------
    rows
        Further (matrix, lower, upper): cuts, held volume, pool rows in use.
    lazy_rows
        Rows that SCIP separates when violated; they only strengthen.
    lower, upper
        Column bounds in place of the program's, for restricted models.
    """

    def __init__(
        self,
        program: Program,
        coefficients: Floats,
        rows: Iterable[RowSet] = (),
        lazy_rows: Iterable[RowSet] = (),
        lower: Floats | None = None,
        upper: Floats | None = None,
    ) -> None:
        import pyscipopt

        self._pyscipopt: Any = pyscipopt
        self.scip: Any = pyscipopt.Model()
        self.scip.hideOutput()
        self.program = program
        low = program.lower if lower is None else lower
        high = program.upper if upper is None else upper
        kinds = ["I" if whole else "C" for whole in program.integer.tolist()]
        self.variables: list[Any] = [
            self.scip.addVar(f"v{j}", vtype=kind, lb=a, ub=b, obj=c)
            for j, (kind, a, b, c) in enumerate(
                zip(kinds, low.tolist(), high.tolist(), coefficients.tolist())
            )
        ]
        self._add((program.rows.matrix(program.column_count), program.rows.lower, program.rows.upper))
        for block in rows:
            self._add(block)
        for block in lazy_rows:
            self._add(block, initial=False, removable=True)

    def _add(self, block: RowSet, **options: bool) -> None:
        from pyscipopt.scip import Expr, ExprCons, Term

        matrix, lower, upper = block
        terms = [Term(variable) for variable in self.variables]
        starts, columns, values = matrix.indptr.tolist(), matrix.indices.tolist(), matrix.data.tolist()
        for row, (low, high) in enumerate(zip(lower.tolist(), upper.tolist())):
            chosen = range(starts[row], starts[row + 1])
            entries = {terms[columns[place]]: values[place] for place in chosen}
            sides = {
                "lhs": None if low == -np.inf else low,
                "rhs": None if high == np.inf else high,
            }
            self.scip.addCons(ExprCons(Expr(entries), **sides), **options)

    def add_start(self, values: Floats) -> bool:
        """Offer a full point as a starting plan; whether SCIP takes it (addSol alone always says yes)."""
        solution = self.scip.createSol()
        for variable, value in zip(self.variables, values.tolist()):
            if value != 0.0:
                self.scip.setSolVal(solution, variable, value)
        if not self.scip.checkSol(solution, original=True):
            self.scip.freeSol(solution)
            return False
        return bool(self.scip.addSol(solution, free=True))

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
        """Solve until the gap, the node limit, the control's limit or its cancelling.

        `on_plan` gets each new best point, `on_bound` each new dual bound (scaled), from the solving
        thread; what they raise is raised again here.
        """
        scip = self.scip
        for name, value in self._parameters(control, gap, node_limit).items():
            scip.setParam(name, value)
        for name, value in (settings or {}).items():
            scip.setParam(name, value)
        if objective_limit is not None:
            scip.setObjlimit(objective_limit)
        watcher = _watcher(self, control, on_plan, on_bound)
        scip.includeEventhdlr(watcher, "progress", "reports plans and bounds, obeys the limit")
        with control.interrupting(self.interrupt):
            scip.optimizeNogil()
        if watcher.error is not None:
            raise watcher.error
        return self._end(objective_limit)

    def _parameters(self, control: Control, gap: float, node_limit: int | None) -> dict[str, Any]:
        return {
            "limits/time": min(max(control.remaining_s(), 0.01), 1e20),
            "limits/gap": gap,
            "limits/nodes": -1 if node_limit is None else node_limit,
            "randomization/randomseedshift": control.seed,
            "randomization/permutationseed": control.seed,
            "misc/catchctrlc": False,
            "misc/usesymmetry": 0,
            "timing/clocktype": 2,
        }

    def interrupt(self) -> None:
        """Have SCIP stop; may be called from any thread and at any time.

        SCIP refuses while it sets up the solve: the watcher then stops it at its next event.
        """
        stages = self._pyscipopt.SCIP_STAGE
        if self.scip.getStage() not in (stages.INITSOLVE, stages.EXITSOLVE, stages.FREETRANS, stages.FREE):
            self.scip.interruptSolve()

    def point(self, solution: Any) -> Floats:
        """Return the values of a SCIP solution in the order of the program's columns."""
        get = self.scip.getSolVal
        return np.array([get(solution, variable) for variable in self.variables])

    def _end(self, objective_limit: float | None) -> MipEnd:
        scip = self.scip
        word = scip.getStatus()
        count = scip.getNSols()
        values = self.point(scip.getBestSol()) if count else None
        objective = float(scip.getSolObjVal(scip.getBestSol())) if count else np.inf
        dual = float(scip.getDualbound())
        bound = -np.inf if abs(dual) >= SCIP_INFINITY else dual
        if word in ("optimal", "gaplimit"):
            return MipEnd(MipStatus.OPTIMAL, values, objective, min(bound, objective))
        if word in ("infeasible", "inforunbd"):
            proven = np.inf if objective_limit is None else objective_limit
            return MipEnd(MipStatus.INFEASIBLE, values, objective, min(proven, objective))
        return MipEnd(MipStatus.LIMIT, values, objective, min(bound, objective))


def _watcher(
    model: ScipModel,
    control: Control,
    on_plan: Callable[[Floats], None] | None,
    on_bound: Callable[[float], None] | None,
) -> Any:
    """Return an event handler; its class is made here since pyscipopt must not be imported at start-up."""
    import pyscipopt

    events: Any = pyscipopt.SCIP_EVENTTYPE  # type: ignore[attr-defined]

    kinds = events.BESTSOLFOUND | events.NODESOLVED | events.FIRSTLPSOLVED

    class Watcher(pyscipopt.Eventhdlr):
        """Reports plans and bounds; SCIP would swallow an exception, so it is kept and raised later."""

        error: BaseException | None = None

        def eventinit(self) -> None:
            self.model.catchEvent(kinds, self)

        def eventexit(self) -> None:
            self.model.dropEvent(kinds, self)

        def eventexec(self, event: Any) -> None:
            try:
                if control.stop_requested():
                    model.interrupt()
                if event.getType() == events.BESTSOLFOUND and on_plan is not None:
                    on_plan(model.point(self.model.getBestSol()))
                elif on_bound is not None and abs(bound := self.model.getDualbound()) < SCIP_INFINITY:
                    on_bound(bound)
            except BaseException as error:
                self.error = error
                model.interrupt()

    return Watcher()
