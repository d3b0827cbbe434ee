"""What the parts of the carrier engine share: model, objective, bounds, cuts, and the best plan so far."""

from __future__ import annotations

import threading
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from hubdesign.model.layout import Model
from hubdesign.model.objective import Objective
from hubdesign.pricing import price
from hubdesign.solve.carrier.closing import hopeless_links
from hubdesign.solve.carrier.cuts import CutMaker
from hubdesign.solve.carrier.linear import LinearModel
from hubdesign.solve.control import Control
from hubdesign.solve.finish import Plan, plan_value, read_design, set_fleet, tidy
from hubdesign.solve.relaxation import LpStatus

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]
RowSet = tuple[sparse.csr_array, Floats, Floats]

#: With more flow columns than this, itineraries of two transfers enter the LP only when they price in.
ALL_COLUMNS = 4000


@dataclass(frozen=True)
class Families:
    """Positions of the columns of each family."""

    hub: Ints
    link: Ints
    frequency: Ints
    vehicles: Ints
    purchases: Ints
    unserved: Ints
    flow: Ints


class StepControl(Control):
    """A Control of a step that also stops when the bound side has finished."""

    def __init__(self, whole: Control, done: threading.Event) -> None:
        super().__init__(whole.remaining_s(), whole.gap, whole.threads, whole.seed, whole.maximise)
        self._whole, self._done = whole, done

    def stop_requested(self) -> bool:
        """Whether the limit is reached, somebody asked to stop, or nobody needs the step any more."""
        return self._done.is_set() or self._whole.stop_requested() or super().stop_requested()


class Setting:
    """One phase of one model; plans may be offered from any thread.

    Attributes
    ----------
    lower, upper
        Bounds of all columns, hopeless links shut, shape (columns,).
    groups
        Demand of each flow and unserved column, else -1, shape (columns,).
    """

    def __init__(
        self,
        model: Model,
        objective: Objective,
        control: Control,
        record: Control,
        held: tuple[RowSet, ...] = (),
    ) -> None:
        self.model, self.objective = model, objective
        self.control, self.record, self.held = control, record, held
        program = model.program
        self.program = program
        self.of = Families(*(model.family(name).indices for name in Families.__dataclass_fields__))
        self.integer = np.flatnonzero(program.integer)
        self.lower, self.upper = program.lower, program.upper
        self._closing_data()
        shut = hopeless_links(model, objective) if not held else np.zeros(len(self.of.link), dtype=bool)
        self.upper[self.of.link[shut]] = 0.0
        self.upper = self.follow(self.upper)
        self.groups = np.full(program.column_count, -1, dtype=np.int64)
        self.groups[self.of.flow] = model.flows.demand
        self.groups[self.of.unserved] = np.arange(len(self.of.unserved))
        rows, pool, count = program.rows, program.pool, program.column_count
        self.base_rows: tuple[RowSet, ...] = ((rows.matrix(count), rows.lower, rows.upper), *held)
        self.pool_rows: RowSet = (pool.matrix(count), pool.lower, pool.upper)
        self.cuts = CutMaker(model)
        self._lock = threading.Lock()
        self.plan: Plan | None = None
        self.point: Floats | None = None
        self.bound = -np.inf
        self.done = threading.Event()  # the bound side has finished

    def _closing_data(self) -> None:
        flows, network = self.model.flows, self.model.network
        self._link_of_entry = network.leg.link[flows.on_leg.item]
        self._service_link = network.service.link

    def follow(self, upper: Floats) -> Floats:
        """Return `upper` with what closed links and hubs forbid closed too: departures and flows."""
        result = upper.copy()
        flows = self.model.flows
        shut = result[self.of.link] <= 0.0
        none = np.zeros(len(shut))
        np.add.at(none, self._service_link, result[self.of.frequency])
        shut |= none <= 0.0
        result[self.of.frequency[shut[self._service_link]]] = 0.0
        result[self.of.flow[flows.on_leg.column[shut[self._link_of_entry]]]] = 0.0
        no_hub = result[self.of.hub] <= 0.0
        result[self.of.flow[flows.hub_at.column[no_hub[flows.hub_at.item]]]] = 0.0
        return result

    # -- plans -----------------------------------------------------------------------------------------

    @property
    def cutoff(self) -> float:
        """Scaled objective of the best plan; inf without one."""
        plan = self.plan
        return np.inf if plan is None else self.objective.scaled(plan.value)

    @property
    def target(self) -> float:
        """A node whose bound reaches this needs no further work: it is within the gap asked."""
        cutoff = self.cutoff
        if not np.isfinite(cutoff) or self.plan is None:
            return np.inf
        give = max(0.9 * self.control.gap, 1e-7) * abs(self.plan.value) / self.objective.scale
        return cutoff - give

    def offer(self, values: Floats) -> Plan | None:
        """Make a plan of a point's integers, its flows worked out anew, and keep it if it is the best."""
        point = self.settle(values)
        return None if point is None else self.take(point)

    def take(self, point: Floats) -> Plan:
        """Price a settled point and keep its plan if it is the best."""
        design = tidy(self.model, read_design(self.model, point))
        bill = price(self.model.network, design)
        plan = Plan(design, bill, plan_value(bill, self.objective.phase))
        sign = -1.0 if self.objective.maximise else 1.0
        with self._lock:
            if self.plan is None or sign * plan.value < sign * self.plan.value:
                self.plan, self.point = plan, point
                self.record.report(best=plan.value)
        return plan

    def settle(self, values: Floats) -> Floats | None:
        """Return the best point with the integers of `values` (rounded), None where flows cannot follow.

        Vehicles are set to what the departures need.
        """
        lower, upper = self.lower.copy(), self.program.upper
        fixed = values.copy()
        fixed[self.integer] = np.round(values[self.integer])
        carries = np.zeros(len(self.of.link))
        np.add.at(carries, self._service_link, fixed[self.of.frequency])
        # A link is open where something flies on it, whatever share of it an LP had opened.
        fixed[self.of.link] = np.maximum(np.minimum(carries, 1.0), self.lower[self.of.link])
        set_fleet(self.model, fixed)
        whole = self.integer
        fixed[whole] = np.clip(fixed[whole], lower[whole], upper[whole])
        lower[whole] = upper[whole] = fixed[whole]
        upper = self.follow(upper)
        active = upper > 0.0
        active[whole] = True
        lp = LinearModel(self.program, self.objective.coefficients, active, lower, upper, self.held)
        if lp.solve(interior=False) is not LpStatus.OPTIMAL:
            return None
        point = lp.values.copy()
        point[whole] = fixed[whole]
        return point

    # -- bounds ----------------------------------------------------------------------------------------

    def improve_bound(self, scaled: float) -> None:
        """Take a bound on every plan (scaled, minimised) if it is better, and report it."""
        with self._lock:
            if scaled <= self.bound or not np.isfinite(scaled):
                return
            self.bound = scaled
        self.record.report(bound=self.objective.value_of(min(scaled, self.cutoff)))

    def stop(self) -> bool:
        """Whether there is nothing left to do, or no time to do it."""
        return self.control.stop_requested() or self.bound >= self.target

    def start_columns(self, upper: Floats | None = None) -> Bools:
        """Return the columns that an LP within `upper` (None: the problem's own) starts with, a mask."""
        active = (self.upper if upper is None else upper) > 0.0
        active[self.integer] = True
        flows = self.model.flows
        if int(active[self.of.flow].sum()) > ALL_COLUMNS:
            late = flows.itineraries.transfers[flows.of_itinerary] >= 2
            active[self.of.flow[late]] = False
        return active

    def new_lp(self) -> LinearModel:
        """Return an LP without pool rows and cuts."""
        return LinearModel(
            self.program,
            self.objective.coefficients,
            self.start_columns(),
            self.lower,
            self.upper,
            self.held,
            seed=self.control.seed,
        )
