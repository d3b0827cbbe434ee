"""Better plans from small trees around the plan in hand: most links held, the rest decided afresh.

Relaxation-induced neighbourhoods (Danna, Rothberg and Le Pape 2005, Math. Programming 102:71-90) in turn with
random ones (links of small reduced cost, links around a node). Everything here only restricts, so nothing
it proves is used as a bound.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign.solve.control import Control
from hubdesign.solve.fixed_charge.plan import FlowSolver, Incumbent
from hubdesign.solve.fixed_charge.relaxation import PathRelaxation
from hubdesign.solve.fixed_charge.tree import LinkTree

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]

#: Nodes of a small tree, and the share by which it must better the plan.
_NODES = 60
_GAIN = 2e-5


class Neighbourhoods:
    """A sequence of restricted searches; each call of `improve` is one of them."""

    def __init__(self, lp: PathRelaxation, flows: FlowSolver, incumbent: Incumbent, control: Control) -> None:
        self.lp, self.flows, self.incumbent, self.control = lp, flows, incumbent, control
        self.root = lp.y.copy()
        self.reduced = np.abs(lp.link_reduced)
        self.lower, self.upper = lp.lower.copy(), lp.upper.copy()
        self.random = np.random.default_rng(control.seed)
        self.extra = 0.15
        self.round = 0

    def improve(self) -> bool:
        """Search one neighbourhood; whether the plan got better."""
        plan = self.incumbent.plan
        if plan is None:
            return False
        before = plan.cost
        free = self._free(plan.open)
        lower = np.where(free, self.lower, np.maximum(self.lower, plan.open))
        upper = np.where(free, self.upper, np.maximum(self.lower, plan.open))
        self.lp.set_links(lower, upper)
        tree = LinkTree(self.lp, self.flows, self.incumbent, self.control, plunge=True, least_gain=_GAIN)
        tree.grow(_NODES)
        self.lp.set_links(self.lower, self.upper)
        better = bool(self.incumbent.plan is not None and self.incumbent.plan.cost < before)
        if not better:
            self.extra = min(1.0, self.extra * 1.15) if tree.done else max(0.05, self.extra * 0.8)
        self.round += 1
        return better

    def _free(self, opened: Bools) -> Bools:
        """Return the links to decide afresh."""
        differ = np.abs(self.root - opened) > 1e-3
        kind = self.round % 3
        inst = self.lp.form.instance
        if kind == 0:
            keep = self.random.random(len(opened)) < min(1.0, 4.0 * self.extra)
            return np.asarray(differ & keep, dtype=bool)
        if kind == 1:
            weight = self.reduced * self.random.uniform(0.2, 1.0, len(opened))
            chosen = np.argsort(weight, kind="stable")[: max(5, int(0.7 * self.extra * len(opened)))]
            free = np.zeros(len(opened), dtype=bool)
            free[chosen] = True
            return free
        count = max(2, int(self.extra * inst.nodes))
        nodes = np.zeros(inst.nodes, dtype=bool)
        nodes[self.random.choice(inst.nodes, min(count, inst.nodes), replace=False)] = True
        free = np.zeros(len(opened), dtype=bool)
        free[inst.link[nodes[inst.tail] & nodes[inst.head]]] = True
        return np.asarray(free | (differ & (self.random.random(len(opened)) < self.extra)), dtype=bool)
