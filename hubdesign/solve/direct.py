"""The engine for every problem: strong relaxation by row generation, a first plan, branch and cut in SCIP.

Validity of the bound: the relaxation holds all rows of the model and valid pool rows, so its optimum bounds
every plan; SCIP starts from the same rows and its dual bound is a bound for the same reason. The larger of
the two (in the minimised sense) is reported, rounded outward.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from hubdesign.answer import Design, Status
from hubdesign.model.build import build_model
from hubdesign.model.layout import Model
from hubdesign.model.objective import Objective, build_objective, goal_phases
from hubdesign.network import Network
from hubdesign.problem import Phase
from hubdesign.solve.allocation_search import search_allocation
from hubdesign.solve.control import Control
from hubdesign.solve.finish import Finisher, Plan, conclude, integers_of
from hubdesign.solve.relaxation import LpStatus, Relaxation
from hubdesign.solve.rounding import round_up
from hubdesign.solve.scip import MipStatus, RowSet, ScipModel

Floats = NDArray[np.float64]

#: Up to this many pool rows SCIP gets all of them to separate by itself; more only slow it down.
_LAZY_ROWS = 20_000

#: A restricted model with the allocation fixed gets this share of the time left, and this many nodes.
_FIXED_SHARE = 0.1
_FIXED_NODES = 300

#: Share of the time limit that a first phase may take.
_FIRST_PHASE = 0.7


def solve_direct(network: Network, control: Control, starts: tuple[Design, ...] = ()) -> Design:
    """Return a Design of the goal's best plan, in one phase or two.

    Parameters
    ----------
    network
        The candidates; `control.maximise` must fit the goal.
    control
        Limits and the record.
    starts
        Plans on the same candidates to start from.
    """
    model = build_model(network)
    control.announce(_method(model))
    phases = goal_phases(model)
    points = tuple(integers_of(model, plan) for plan in starts)
    if len(phases) == 1:
        return PhaseRun(model, phases[0], control, starts=points).design()
    first_control = control.part(control.remaining_s() * _FIRST_PHASE)
    first = PhaseRun(model, phases[0], first_control, report_to=control, starts=points)
    design = first.design()
    if first.plan is None:
        return design
    held = hold(model, first.objective, first.plan.value)
    second_control = control.part(control.remaining_s(), maximise=False)
    kept = () if first.point is None else (first.point,)
    second = PhaseRun(model, phases[1], second_control, held=(held,), starts=kept)
    return join_phases(design, second.design(), second.plan, model)


def hold(model: Model, objective: Objective, value: float) -> RowSet:
    """Return the row that keeps a later phase at least as good as `value` in this objective."""
    scaled = objective.scaled(value)
    columns = np.flatnonzero(objective.coefficients)
    size = max(1.0, float(np.abs(objective.coefficients).max(initial=0.0)))
    matrix = sparse.csr_array(
        (objective.coefficients[columns] / size, columns, np.array([0, len(columns)])),
        shape=(1, model.program.column_count),
    )
    return matrix, np.array([-np.inf]), np.array([(scaled + 1e-9 * abs(scaled) + 1e-9) / size])


def join_phases(first: Design, second: Design, plan: Plan | None, model: Model) -> Design:
    """Return the second phase's plan under the first phase's proof; the cost goes beside it.

    Where volume came first only as a means (today's network) the second phase is the answer.
    """
    if plan is None or not second.has_plan or first.bound is None:
        return first
    if model.network.problem.settings.objective_phase != "volume":
        return second
    carried = plan.bill.volume_carried
    return second.replace(
        status=first.status,
        objective=carried,
        bound=max(first.bound, carried),
        second_objective=second.objective,
        second_bound=second.bound,
        progress=first.progress,
        method=first.method,
    )


@dataclass
class PhaseRun:
    """One objective of one model: plans and bounds as they come, the Design at the end."""

    model: Model
    phase: Phase
    control: Control
    report_to: Control | None = None
    held: tuple[RowSet, ...] = ()
    starts: tuple[Floats, ...] = ()
    plan: Plan | None = None
    point: Floats | None = None
    bound: float = -np.inf  # scaled, minimised
    objective: Objective = field(init=False)

    def __post_init__(self) -> None:
        self.objective = build_objective(self.model, self.phase)
        self.record = self.report_to or self.control
        self.finisher = Finisher(self.model, self.objective)
        for rows in self.held:
            self.finisher.lp.add_rows(*rows)

    def design(self) -> Design:
        """Solve and conclude."""
        for start in self.starts:
            self.offer(start)
        found = search_allocation(self.model, self.control)
        for point in found:
            self.offer(point)
        lp = Relaxation(self.model.program, self.objective.coefficients, seed=self.control.seed)
        for rows in self.held:
            lp.add_rows(*rows)
        status = lp.separate(max(1.0, self.control.remaining_s()))
        if status is LpStatus.INFEASIBLE:
            return Design(Status.INFEASIBLE, progress=self.record.record)
        if status is LpStatus.OPTIMAL:
            self.improve_bound(lp.safe_bound())
        for point in found[:1]:
            self.offer(self._with_allocation_fixed(point, lp))
        rounded = round_up(self.model, lp, self.finisher)
        if rounded is not None:
            self.offer(rounded)
        end = None if self._closed() else self._branch(lp)
        return self._conclude(end)

    def _with_allocation_fixed(self, point: Floats, lp: Relaxation) -> Floats:
        """Return the best point found with the hubs and the allocation of `point`.

        The search gives each pair of stations one mode; with the allocation fixed the model is small, and
        SCIP sorts out where two modes on a pair are better.
        """
        program = self.model.program
        lower, upper = program.lower, program.upper
        for name in ("hub", "allocation"):
            members = self.model.family(name).members
            lower[members] = upper[members] = point[members]
        scip = ScipModel(program, self.objective.coefficients, self._rows(lp), lower=lower, upper=upper)
        if self.finisher.plan(point) is not None:
            scip.add_start(self.finisher.point)
        part = self.control.part(_FIXED_SHARE * self.control.remaining_s())
        end = scip.run(part, gap=0.5 * self.control.gap, node_limit=_FIXED_NODES)
        return point if end.values is None else end.values

    def _rows(self, lp: Relaxation) -> list[RowSet]:
        """Return the held rows and the pool rows in use."""
        pool, inside = self.model.program.pool, np.flatnonzero(lp.pool_in)
        return [*self.held, (sparse.csr_array(lp.pool[inside]), pool.lower[inside], pool.upper[inside])]

    def _closed(self) -> bool:
        """Whether the plan in hand meets the gap asked already."""
        return self.plan is not None and self.record.gap_reached()

    def _branch(self, lp: Relaxation) -> MipStatus:
        pool = self.model.program.pool
        lazy: list[RowSet] = []
        outside = np.flatnonzero(~lp.pool_in)
        if pool.count <= _LAZY_ROWS:
            lazy.append((sparse.csr_array(lp.pool[outside]), pool.lower[outside], pool.upper[outside]))
        scip = ScipModel(self.model.program, self.objective.coefficients, self._rows(lp), lazy)
        if self.point is not None:
            scip.add_start(self.point)
        end = scip.run(
            self.control, gap=self.control.gap * 0.999, on_plan=self.offer, on_bound=self.improve_bound
        )
        if end.status is not MipStatus.INFEASIBLE:
            self.improve_bound(end.bound)
        if self.plan is None and end.values is not None:
            self.keep(self.finisher.from_point(end.values), end.values)
        return end.status

    def offer(self, values: Floats) -> None:
        """Make a plan of a point's integers and keep it if it is the best."""
        plan = self.finisher.plan(values)
        if plan is not None:
            self.keep(plan, self.finisher.point)

    def keep(self, plan: Plan, point: Floats) -> None:
        """Keep `plan` if it is better than the one in hand."""
        sign = -1.0 if self.objective.maximise else 1.0
        if self.plan is None or sign * plan.value < sign * self.plan.value:
            self.plan, self.point = plan, point
            self.record.report(best=plan.value)

    def improve_bound(self, scaled: float) -> None:
        """Take a dual bound (scaled, minimised) if it is better."""
        if scaled > self.bound:
            self.bound = scaled
            self.record.report(bound=self.objective.value_of(scaled))

    def _conclude(self, end: MipStatus | None) -> Design:
        if self.plan is None:
            status = Status.INFEASIBLE if end is MipStatus.INFEASIBLE else Status.UNKNOWN
            return Design(status, progress=self.record.record)
        bound = self.objective.value_of(self.bound)
        design = conclude(self.plan, bound, self.objective, self.control, _method(self.model))
        return design.replace(progress=self.record.record)


def _method(model: Model) -> str:
    """Return the one line that says what was solved and how."""
    network = model.network
    way = "legs" if (model.flows.of_itinerary < 0).any() else "itineraries"
    return (
        f"{network.station_count} stations, {network.link_count} candidate links, {len(model.flows)} {way}:"
        " strong relaxation by row generation, then branch and cut"
    )
