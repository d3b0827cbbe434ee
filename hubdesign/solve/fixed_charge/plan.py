"""The plan in hand: flows re-optimised on chosen links, shared by the bound side and the plan side."""

from __future__ import annotations

import threading
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from hubdesign.solve.control import Control
from hubdesign.solve.fixed_charge.relaxation import Formulation, PathRelaxation

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]

#: A share of a commodity that must be carried may be missing by this much: rounding of the LP.
MISSING = 1e-7
_USED = 1e-9


@dataclass(frozen=True, slots=True)
class Plan:
    """Open links, their flows and the cost in money."""

    open: Bools
    paths: tuple[tuple[int, tuple[int, ...], float], ...]
    cost: float


class FlowSolver:
    """Cheapest flows on given links: the path LP with the links fixed, where rows 3 hold by themselves."""

    def __init__(self, form: Formulation, seed: int) -> None:
        self.form, self.seed = form, seed
        self.carrier: PathRelaxation | None = None
        self.lp = PathRelaxation(form, seed)

    def reset(self) -> None:
        """Start afresh with the prices of `form` as they are now."""
        self.lp = PathRelaxation(self.form, self.seed)

    def cannot_carry(self, links: Bools, control: Control) -> bool:
        """Whether `links` are proven too few to carry what must be carried."""
        if self.carrier is None:
            self.carrier = PathRelaxation(self.form.carrying(), self.seed)
        lp, chosen = self.carrier, (links | self.form.instance.must_open).astype(np.float64)
        lp.set_links(chosen, chosen)
        for _ in range(500):
            if control.stop_requested() or not lp.run():
                return False
            bound, found = lp.price()
            if bound > MISSING:
                return True
            if not lp.add_paths(found):
                return False
        return False

    def plan(self, links: Bools, control: Control, cutoff: float = np.inf) -> Plan | None:
        """Return the cheapest plan that opens no link but `links`; None without one below `cutoff`."""
        inst = self.form.instance
        links = links | inst.must_open
        for _ in range(3):
            chosen = links.astype(np.float64)
            self.lp.set_links(chosen, chosen)
            if not self._flows(control, cutoff):
                return None
            shares = self.lp.arc_shares()
            used = np.zeros(inst.links, dtype=bool)
            used[inst.link[(shares > _USED).any(axis=0)]] = True
            used |= inst.must_open
            if np.array_equal(used, links):
                break
            links = used
        return self._read(links)

    def _flows(self, control: Control, cutoff: float) -> bool:
        """Solve to optimal flows; whether they carry what must be carried."""
        lp = self.lp
        for _ in range(500):
            if control.cancelled or not lp.run():
                return False
            bound, found = lp.price()
            if bound >= cutoff:
                return False
            if not lp.add_paths(found):
                break
        return float(lp.s[self.form.forced].max(initial=0.0)) <= MISSING

    def _read(self, links: Bools) -> Plan:
        lp, inst, form = self.lp, self.form.instance, self.form
        served = 1.0 - np.where(form.forced, 0.0, np.clip(lp.s, 0.0, 1.0))
        total = np.zeros(inst.commodities)
        used = np.flatnonzero(lp.x > _USED)
        for place in used.tolist():
            total[lp.paths[place][0]] += lp.x[place]
        paths = []
        cost = float(inst.fixed_cost[links].sum())
        cost += float((form.unserved * form.scale * (1.0 - served))[~form.forced].sum())
        for place in used.tolist():
            k, arcs = lp.paths[place]
            share = float(lp.x[place] * served[k] / total[k])
            paths.append((k, arcs, share))
            cost += share * form.scale * float(form.cost[k, list(arcs)].sum())
        return Plan(links.copy(), tuple(sorted(paths)), cost)


class Incumbent:
    """Keeps the best plan and tells the record; safe from several threads."""

    def __init__(self, form: Formulation, control: Control) -> None:
        self.form = form
        self.control = control
        self.plan: Plan | None = None
        self._lock = threading.Lock()

    @property
    def scaled(self) -> float:
        """Cost in the units of the relaxation, inf without a plan."""
        plan = self.plan
        return np.inf if plan is None else plan.cost / self.form.scale

    @property
    def cutoff(self) -> float:
        """A bound of at least this closes a node: nothing below it is better by more than the gap asked."""
        scaled = self.scaled
        return scaled - max(0.999 * self.control.gap, 4e-7) * abs(scaled) if np.isfinite(scaled) else np.inf

    def offer(self, plan: Plan | None) -> bool:
        """Keep `plan` if it is the best; whether it was."""
        if plan is None:
            return False
        with self._lock:
            if self.plan is not None and plan.cost >= self.plan.cost * (1.0 - 1e-10):
                return False
            self.plan = plan
        self.control.report(best=plan.cost)
        return True
