"""Fixed-charge design: strong path relaxation, capacity scaling, a tree over links, small trees for plans.

The bound side grows the tree, the plan side searches neighbourhoods. On two threads both run at once (HiGHS
releases the interpreter while it works); on one they take turns by node counts, so that a finished solve is
repeatable.
"""

from __future__ import annotations

import threading

import numpy as np

from hubdesign.solve.control import Control
from hubdesign.solve.fixed_charge.instance import (
    Bools,
    FixedChargeAnswer,
    FixedChargeInstance,
    FixedChargeStatus,
)
from hubdesign.solve.fixed_charge.neighbourhood import Neighbourhoods
from hubdesign.solve.fixed_charge.plan import FlowSolver, Incumbent
from hubdesign.solve.fixed_charge.relaxation import Formulation, PathRelaxation
from hubdesign.solve.fixed_charge.scaling import scale_capacities
from hubdesign.solve.fixed_charge.tree import LinkTree

#: Speed of capacity scaling: two passes, the second where the first may have rushed.
_STEPS = (0.3, 0.1)
#: Tree nodes and small trees in turn on one thread.
_TURN = 10


def solve_fixed_charge(
    instance: FixedChargeInstance, control: Control, starts: tuple[Bools, ...] = ()
) -> FixedChargeAnswer:
    """Return the best plan found within the control's limits, and its bound.

    Parameters
    ----------
    instance
        The question.
    control
        Limits and the record, which gets plans and bounds in money.
    starts
        Open links of plans to start from, each shape (E,).
    """
    form = Formulation(instance)
    flows = FlowSolver(form, control.seed)
    incumbent = Incumbent(form, control)
    everything = np.ones(instance.links, dtype=bool)
    if (form.forced & ~form.reachable).any() or flows.cannot_carry(everything, control):
        return _answer(form, incumbent, np.inf, FixedChargeStatus.INFEASIBLE)
    _open_all(form, flows, incumbent, control)
    for links in starts:
        incumbent.offer(flows.plan(links, control, incumbent.scaled))
    lp = PathRelaxation(form, control.seed)
    finished = lp.solve(control)
    bound = lp.bound
    if np.isfinite(bound):
        control.report(bound=(bound - 0.5e-9 * abs(bound)) * form.scale)
    if finished and not control.gap_reached():
        bound = max(bound, _search(lp, flows, incumbent, control))
    return _answer(form, incumbent, bound, None)


def _open_all(form: Formulation, flows: FlowSolver, incumbent: Incumbent, control: Control) -> None:
    """Offer the plan with every link open; the price of not carrying is raised until that is not worth it."""
    everything = np.ones(form.instance.links, dtype=bool)
    for _ in range(4):
        if incumbent.offer(flows.plan(everything, control)) or control.stop_requested():
            return
        form.raise_price()
        flows.reset()


def _search(lp: PathRelaxation, flows: FlowSolver, incumbent: Incumbent, control: Control) -> float:
    form = lp.form
    helper = PathRelaxation(form, control.seed)
    helper.copy_from(lp)
    helper.solve(control)
    for step in _STEPS:
        if control.gap_reached() or control.stop_requested():
            break
        scale_capacities(helper, flows, incumbent, control, step)
    helper.solve(control)
    tree = LinkTree(lp, flows, incumbent, control)
    sides = Neighbourhoods(helper, FlowSolver(form, control.seed), incumbent, control)
    if control.threads > 1:
        _on_two_threads(sides, tree, control)
    else:
        _in_turns(sides, tree, control)
    return tree.bound


def _in_turns(sides: Neighbourhoods, tree: LinkTree, control: Control) -> None:
    pause = 1
    while not tree.done and not control.stop_requested() and not control.gap_reached():
        tree.grow(_TURN * pause)
        if tree.done or control.stop_requested() or control.gap_reached():
            break
        pause = 1 if sides.improve() else min(20, pause + 1)
    tree.grow(0)


def _on_two_threads(sides: Neighbourhoods, tree: LinkTree, control: Control) -> None:
    """Run both sides until the tree is done, the gap closed or the limit reached."""
    failed: list[BaseException] = []
    step = control.part(control.remaining_s())
    sides.control = step

    def run() -> None:
        try:
            while not step.stop_requested() and not control.gap_reached():
                sides.improve()
        except BaseException as error:
            failed.append(error)

    thread = threading.Thread(target=run, daemon=True)
    thread.start()
    try:
        tree.grow()
    finally:
        step.end()
        thread.join()
    tree.grow(0)
    if failed:
        raise failed[0]


def _answer(
    form: Formulation, incumbent: Incumbent, bound: float, status: FixedChargeStatus | None
) -> FixedChargeAnswer:
    plan = incumbent.plan
    if plan is None:
        ended = status or FixedChargeStatus.UNKNOWN
        return FixedChargeAnswer(ended, np.zeros(form.instance.links, dtype=bool), (), np.inf, np.inf)
    outward = (bound - 0.5e-9 * abs(bound)) * form.scale if np.isfinite(bound) else -np.inf
    outward = min(outward, plan.cost)
    gap = plan.cost - outward
    proven = gap <= max(incumbent.control.gap, 1e-6) * abs(plan.cost)
    word = FixedChargeStatus.PROVEN if proven else FixedChargeStatus.FEASIBLE
    return FixedChargeAnswer(word, plan.open, plan.paths, plan.cost, outward)
