"""Multiple allocation, proven: cuts from closed-form duals, a small tree over hubs.

1. A plan by local search. 2. The relaxation over the most promising hubs (a core), cut at points between the
solution and a moving centre (in-out separation: Ben-Ameur and Neto 2007, Networks 49:3-17; Fischetti, Ljubic
and Sinnl 2017, Management Science 63:2146-2162). 3. Every hub outside the core is priced with the averaged
duals and, where its bound is above the plan, gone for good; the others join the core. 4. A best-first tree.

Validity. Cuts hold for every 0/1 vector (:mod:`ascent`), bounds are recomputed from them (:mod:`master`), and
a hub is fixed only where the bound with it is above the best plan less the tolerance. The averaged duals of
the rows of an origin are feasible for the core's pairs, since the constraints are linear in (v, u); pricing
extends them to the other hubs by the covering rule of :mod:`ascent`. A node whose hubs are all fixed is
priced truly, so the answer is exact also where the relaxation is not (see :mod:`relaxation`).
"""

from __future__ import annotations

import numpy as np

from hubdesign.solve.control import Control
from hubdesign.solve.hub_location.evaluate import multiple_unit_costs, total_cost
from hubdesign.solve.hub_location.instance import Floats, HubAnswer, HubInstance, HubStatus, Ints
from hubdesign.solve.hub_location.relaxation import Relaxation, build_relaxation
from hubdesign.solve.hub_location.root import Incumbent, Root
from hubdesign.solve.hub_location.search import greedy, improve
from hubdesign.solve.hub_location.tree import search_tree

#: Scaled cost of the first plan; every tolerance is relative to it.
UNIT = 100.0
#: Costs that differ by less than this share are the same.
TOLERANCE = 4e-10


class MultipleIncumbent:
    """The best plan so far, priced truly; costs scaled as in the relaxation."""

    def __init__(self, instance: HubInstance, relaxation: Relaxation, control: Control) -> None:
        self.instance = instance
        self.scale = relaxation.scale
        self.shift = relaxation.constant
        self.control = control
        self.cost = np.inf
        self.hubs: tuple[int, ...] = ()
        self._known: dict[tuple[int, ...], float] = {}

    def offer(self, stations: Ints) -> float:
        """Price the hub set `stations` truly, keep it if it is the best; return its scaled cost."""
        hubs = tuple(sorted(int(h) for h in stations))
        if hubs not in self._known:
            cost = total_cost(self.instance, hubs, multiple_unit_costs(self.instance, hubs))
            self._known[hubs] = cost
            if cost * self.scale - self.shift < self.cost:
                self.cost, self.hubs = cost * self.scale - self.shift, hubs
                self.control.report(best=cost)
        return self._known[hubs] * self.scale - self.shift

    def cutoff(self) -> float:
        """Return the scaled bound from which on nothing is worth finding."""
        if not np.isfinite(self.cost):
            return np.inf
        size = abs(self.cost + self.shift)
        return self.cost - max(self.control.gap, TOLERANCE) * size


def solve_multiple(
    instance: HubInstance, control: Control, hub_sets: tuple[tuple[int, ...], ...] = ()
) -> HubAnswer:
    """Return the cheapest multiple-allocation plan of `instance`, with its bound.

    Parameters
    ----------
    instance
        The question.
    control
        Limits and the record.
    hub_sets
        Sets of open hubs to start from; those the instance does not allow are passed over.

    Raises
    ------
    ValueError
        Where candidates have collection capacities, which this engine does not know.
    """
    if instance.has_capacity:
        raise ValueError("multiple allocation with collection capacities is not served by this engine")
    relaxation = build_relaxation(instance, closure=True)
    if relaxation.hubs_min > relaxation.hubs_max:
        return HubAnswer((), None, np.inf, np.inf, HubStatus.INFEASIBLE)
    if not instance.volume.any():
        return _idle_answer(instance, relaxation)
    relaxation, starts, promise = first_plans(relaxation, control)
    incumbent = MultipleIncumbent(instance, relaxation, control)
    for chosen in starts:
        incumbent.offer(relaxation.hubs[chosen])
    for hubs in hub_sets:
        if is_allowed(instance, hubs):
            incumbent.offer(np.array(hubs))
    root = Root(relaxation, incumbent, control, promise, starts)
    bound = root.run()
    if not root.finished:
        bound = search_tree(root, incumbent, control, bound)
    return conclude(incumbent, incumbent.hubs, None, bound, TOLERANCE, control)


def first_plans(relaxation: Relaxation, control: Control) -> tuple[Relaxation, list[list[int]], Floats]:
    """Return the relaxation scaled to a first plan of `UNIT`, hub sets, and each hub's best cost seen."""
    start = greedy(relaxation, max(1, relaxation.hubs_min))
    cost, chosen, seen = improve(relaxation, start, control.stop_requested)
    size = abs(cost + relaxation.constant) or abs(cost)
    factor = UNIT / size if size > 0.0 else 1.0
    return relaxation.rescale(factor), [chosen], seen * factor


def is_allowed(instance: HubInstance, hubs: tuple[int, ...]) -> bool:
    """Whether the set of open hubs obeys candidates, forced hubs and counts."""
    chosen = set(hubs)
    may = set(instance.hub_candidates.tolist())
    must = set(np.flatnonzero(instance.forced).tolist())
    return bool(hubs) and must <= chosen <= may and instance.hubs_min <= len(chosen) <= instance.hubs_max


def _idle_answer(instance: HubInstance, relaxation: Relaxation) -> HubAnswer:
    """Return the answer where nothing travels: the cheapest allowed number of hubs."""
    order = np.lexsort((relaxation.fixed, ~relaxation.forced))
    cost = relaxation.fixed[order]
    needed = relaxation.hubs_min
    extra = int((cost[needed : relaxation.hubs_max] < 0.0).sum())
    hubs = tuple(sorted(int(h) for h in relaxation.hubs[order[: needed + extra]]))
    total = float(instance.fixed_cost[list(hubs)].sum()) + instance.constant
    return HubAnswer(hubs, None, total, total, HubStatus.PROVEN)


def conclude(
    incumbent: Incumbent,
    hubs: tuple[int, ...],
    allocation: Ints | None,
    bound: float,
    tolerance: float,
    control: Control,
) -> HubAnswer:
    """Return the answer in money; the bound never above the plan. No hubs: no plan was found."""
    if not hubs:
        done = bound == np.inf
        status = HubStatus.INFEASIBLE if done else HubStatus.UNKNOWN
        money = np.inf if done else (bound + incumbent.shift) / incumbent.scale
        return HubAnswer((), None, np.inf, money, status)
    cutoff = incumbent.cutoff()
    # hubs and nodes were given up at the cutoff, so nothing above it is proven; the rest is for rounding
    low = min(bound, cutoff) - 0.1 * tolerance * abs(incumbent.cost + incumbent.shift)
    objective = (incumbent.cost + incumbent.shift) / incumbent.scale
    status = HubStatus.PROVEN if bound >= cutoff else HubStatus.FEASIBLE
    money = (low + incumbent.shift) / incumbent.scale
    control.report(best=objective, bound=money)
    return HubAnswer(hubs, allocation, objective, money, status)
