"""The carrier engine: root, plans and tree, one after the other or on two threads."""

from __future__ import annotations

import threading
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from hubdesign.answer import Design, Status
from hubdesign.model.build import build_model
from hubdesign.model.layout import Model
from hubdesign.model.objective import build_objective, goal_phases
from hubdesign.network import Network
from hubdesign.solve.carrier.bounding import Bounder
from hubdesign.solve.carrier.planning import PlanSide, round_up
from hubdesign.solve.carrier.setting import RowSet, Setting
from hubdesign.solve.carrier.tree import Tree
from hubdesign.solve.control import Control
from hubdesign.solve.direct import hold, join_phases
from hubdesign.solve.finish import conclude, integers_of
from hubdesign.solve.relaxation import LpStatus

Floats = NDArray[np.float64]

#: Share of the time limit that a first phase may take.
_FIRST_PHASE = 0.7

#: One thread: plan steps before the tree, and nodes of the tree for each further step.
_FIRST_STEPS = 3
_NODES_PER_STEP = 4


def solve_carrier(network: Network, control: Control, starts: tuple[Design, ...] = ()) -> Design:
    """Return the best Design found within the control's limits.

    Parameters
    ----------
    network
        The candidates of a problem that :func:`fits`; `control.maximise` must fit the goal.
    control
        Limits and the record.
    starts
        Plans on the same candidates to start from.
    """
    model = build_model(network)
    phases = goal_phases(model)
    points = tuple(integers_of(model, plan) for plan in starts)
    if len(phases) == 1:
        return PhaseRun(model, phases[0], control, control, (), points).design()
    first_control = control.part(control.remaining_s() * _FIRST_PHASE)
    first = PhaseRun(model, phases[0], first_control, control, (), points)
    design = first.design()
    if first.setting.plan is None or first.setting.point is None:
        return design
    held = hold(model, first.setting.objective, first.setting.plan.value)
    second_control = control.part(control.remaining_s(), maximise=False)
    second = PhaseRun(model, phases[1], second_control, second_control, (held,), (first.setting.point,))
    return join_phases(design, second.design(), second.setting.plan, model)


class PhaseRun:
    """One objective of one model."""

    def __init__(
        self,
        model: Model,
        phase: Literal["cost", "profit", "volume"],
        control: Control,
        record: Control,
        held: tuple[RowSet, ...],
        starts: tuple[Floats, ...],
    ) -> None:
        self.setting = Setting(model, build_objective(model, phase), control, record, held)
        self.control, self.record, self.starts = control, record, starts
        self.plans = PlanSide(self.setting)
        self.tree: Tree | None = None
        self._failure: BaseException | None = None
        self._rounds = 0
        self._nodes = 0

    def design(self) -> Design:
        """Solve and conclude."""
        setting = self.setting
        for start in self.starts:
            setting.offer(start)
        infeasible = self._search()
        if setting.plan is None:
            status = Status.INFEASIBLE if infeasible else Status.UNKNOWN
            return Design(status, progress=self.record.record)
        bound = setting.objective.value_of(min(setting.bound, setting.cutoff))
        design = conclude(setting.plan, bound, setting.objective, self.control, self._method())
        return design.replace(progress=self.record.record)

    def _search(self) -> bool:
        """Run bound side and plan side; whether nothing feasible exists."""
        setting = self.setting
        helper = threading.Thread(target=self._plan_work, daemon=True) if self.control.threads > 1 else None
        if helper is not None:
            helper.start()
        try:
            return self._bound_work()
        finally:
            setting.done.set()
            if helper is not None:
                helper.join()
            if self._failure is not None:
                raise self._failure

    def _plan_work(self) -> None:
        """The second thread: plans first, then leaves of the tree."""
        setting = self.setting
        try:
            while not (setting.done.is_set() or setting.control.stop_requested()):
                worked = self.plans.step()
                if not worked and self.tree is not None:
                    worked = self.tree.help()
                if not worked:
                    setting.done.wait(0.02)
        except BaseException as error:
            self._failure = error

    def _bound_work(self) -> bool:
        setting = self.setting
        lp = setting.new_lp()
        bounder = Bounder(setting, lp)
        bounder.fix({})

        def on_round(bound: float) -> None:
            setting.improve_bound(bound)
            self._rounds += 1
            if self._rounds == 1:
                setting.offer(np.zeros(len(lp.values)))  # nothing at all: often allowed, never below 0
            if self._rounds <= 2:
                setting.offer(round_up(setting, lp.values))
            if self._rounds >= 3 and self.plans.wants_rows and self.control.threads > 1:
                self.plans.hand_rows(lp.tight(), lp.values.copy())

        end = bounder.rounds(30, least_gain=1e-3, enough=lambda: setting.target, on_round=on_round, idle=1)
        if end.status is LpStatus.INFEASIBLE:
            return True
        if end.status is not LpStatus.OPTIMAL:
            return False
        self.plans.hand_rows(lp.tight(), lp.values.copy())
        alone = self.control.threads == 1
        if alone:
            for _ in range(_FIRST_STEPS):
                self.plans.step()
        if setting.stop():
            return False
        self.tree = Tree(setting, bounder, end.bound, self.plans.propose, self._between if alone else None)
        finished = self.tree.run()
        return finished and setting.plan is None

    def _between(self, leaf: bool) -> None:
        """One thread: a piece of plan work after each leaf and after every few other nodes."""
        self._nodes += 1
        if leaf or self._nodes % _NODES_PER_STEP == 0:
            self.plans.step()

    def _method(self) -> str:
        model = self.setting.model
        network = model.network
        return (
            f"carrier network, {network.station_count} stations, {network.link_count} candidate links,"
            f" {len(model.flows)} itineraries: rounding cuts, tree over hubs, restricted searches"
        )
