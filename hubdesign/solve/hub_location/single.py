"""Single allocation, proven: hubs fixed by the multiple-allocation bound, then cuts over allocations.

1. A plan by local search over hubs and allocations. 2. The root of multiple allocation (:mod:`root`), a
relaxation of single allocation, against that plan: most hubs are gone. 3. Over the hubs left, the relaxation
of Skorin-Kapov et al. by cuts (:mod:`pairing`, :mod:`choosing`), fixing hubs and allocations by their bounds.
4. A best-first tree, hubs before allocations.

Validity: every single allocation is a multiple-allocation plan at the same cost, so its bounds and fixings
hold; cuts and bounds as their modules say. A node with everything fixed is priced truly.
"""

from __future__ import annotations

import dataclasses
import heapq

import numpy as np

from hubdesign.solve.control import Control
from hubdesign.solve.hub_location.allocation import Choice, allocate, improve_hubs
from hubdesign.solve.hub_location.choosing import AllocationMaster, Left, settle
from hubdesign.solve.hub_location.covers import fewest_hubs, find_covers
from hubdesign.solve.hub_location.evaluate import single_unit_costs, total_cost
from hubdesign.solve.hub_location.instance import Bools, Floats, HubAnswer, HubInstance, HubStatus, Ints
from hubdesign.solve.hub_location.master import Domain
from hubdesign.solve.hub_location.multiple import conclude, first_plans, is_allowed
from hubdesign.solve.hub_location.pairing import Pairs, pair_cuts
from hubdesign.solve.hub_location.relaxation import Relaxation, build_relaxation
from hubdesign.solve.hub_location.root import Root

#: Costs that differ by less than this share are the same.
TOLERANCE = 8e-10
#: A cut must be violated by this much (the first plan costs 100).
VIOLATION = 1e-6
#: Hubs tried in the first local search.
SHORTLIST = 16
#: A choice this near to 0 or 1 counts as decided by the relaxation.
INTEGER = 1e-6


class SingleIncumbent:
    """The best allocation so far, priced truly; costs scaled as in the relaxation."""

    def __init__(
        self, instance: HubInstance, relaxation: Relaxation, choice: Choice, control: Control
    ) -> None:
        self.instance = instance
        self.choice = choice
        self.control = control
        self.scale = relaxation.scale
        self.shift = relaxation.constant
        self.cost = np.inf
        self.allocation: Ints | None = None
        self._tried: set[tuple[int, ...]] = set()

    def offer(self, stations: Ints) -> float:
        """Allocate to the hub set `stations`, keep the plan if it is the best; return its scaled cost."""
        hubs = tuple(sorted(int(h) for h in stations))
        if hubs in self._tried:
            return np.inf
        self._tried.add(hubs)
        found = allocate(self.choice, np.flatnonzero(np.isin(self.choice.hubs, hubs)))
        return np.inf if found is None else self.take(self.choice.hubs[found[1]])

    def take(self, allocation: Ints) -> float:
        """Price `allocation` (n,) in stations truly, keep it if it is the best; return its scaled cost."""
        hubs = np.unique(allocation)
        load = np.bincount(allocation, self.instance.volume.sum(axis=1), self.instance.station_count)
        limit = self.instance.collection_capacity * (1.0 + 1e-9)
        if (load > limit).any() or (allocation[hubs] != hubs).any():
            return np.inf
        if not is_allowed(self.instance, tuple(hubs.tolist())):
            return np.inf
        money = total_cost(self.instance, hubs, single_unit_costs(self.instance, allocation))
        cost = money * self.scale - self.shift
        if cost < self.cost:
            self.cost, self.allocation = cost, allocation.copy()
            self.control.report(best=money)
        return cost

    def cutoff(self) -> float:
        """Return the scaled bound from which on nothing is worth finding."""
        if not np.isfinite(self.cost):
            return np.inf
        return self.cost - max(self.control.gap, TOLERANCE) * abs(self.cost + self.shift)


def solve_single(instance: HubInstance, control: Control, allocations: tuple[Ints, ...] = ()) -> HubAnswer:
    """Return the cheapest single-allocation plan of `instance`, with its bound.

    Parameters
    ----------
    instance
        The question.
    control
        Limits and the record.
    allocations
        Hubs of the stations, (n,) each, to start from; those the instance does not allow are passed over.
    """
    relaxation = _with_fewest_hubs(instance, build_relaxation(instance, closure=False))
    if relaxation.hubs_min > relaxation.hubs_max:
        return HubAnswer((), None, np.inf, np.inf, HubStatus.INFEASIBLE)
    relaxation, starts, promise = first_plans(relaxation, control)
    choice = Choice.of(relaxation, instance)
    incumbent = SingleIncumbent(instance, relaxation, choice, control)
    shortlist = np.argsort(promise, kind="stable")[:SHORTLIST]
    if instance.has_capacity:
        shortlist = np.union1d(shortlist, np.argsort(-choice.capacity, kind="stable")[: SHORTLIST // 2])
    found = improve_hubs(choice, starts[0], shortlist, control.stop_requested)
    if found is not None:
        incumbent.take(choice.hubs[found[1]])
    for allocation in allocations:
        incumbent.take(allocation)
    root = Root(relaxation, incumbent, control, promise, starts)
    bound = root.run()
    if not root.finished and not control.stop_requested():
        bound = AllocationTree(instance, root, incumbent, control, bound).run()
    own = incumbent.allocation
    hubs = () if own is None else tuple(np.unique(own).tolist())
    return conclude(incumbent, hubs, own, bound, TOLERANCE, control)


def _with_fewest_hubs(instance: HubInstance, relaxation: Relaxation) -> Relaxation:
    """Return the relaxation with at least the hubs that the collection capacities need."""
    needed = fewest_hubs(
        instance.collection_capacity[relaxation.hubs],
        relaxation.forced,
        np.ones(len(relaxation.hubs), dtype=bool),
        float(instance.volume.sum()),
    )
    count = len(relaxation.hubs) + 1 if needed is None else needed
    return dataclasses.replace(relaxation, hubs_min=max(relaxation.hubs_min, count))


class AllocationTree:
    """Cuts over allocations to the hubs the root left, then best-first branching."""

    def __init__(
        self,
        instance: HubInstance,
        root: Root,
        incumbent: SingleIncumbent,
        control: Control,
        bound: float,
    ) -> None:
        self.root = root
        self.incumbent = incumbent
        self.control = control
        self.lowest = bound
        self.choice = Choice.of(root.core, instance)
        self.pairs = Pairs.of(self.choice)
        self.left = Left(root.domain, _possible(instance, self.choice))
        self.started = False

    def run(self) -> float:
        """Return the scaled bound after branching to the end, or to the limit."""
        first = settle(self.choice, self.left)
        if first is None:
            return np.inf
        self.left = first
        floor = _pair_floor(self.choice, self.pairs)
        self.master = AllocationMaster(self.choice, floor, self.left)
        self.centre = self._first_centre()
        start = 0.5 * self.centre + 0.5 / max(1, len(self.choice.hubs))
        self._separate(start, np.zeros_like(start), np.full(len(start), -np.inf))
        heap: list[tuple[float, int, Left]] = [(self.lowest, 0, self.left)]
        pruned, count = np.inf, 0
        while heap:
            self.root.report(min(heap[0][0], pruned))
            if heap[0][0] >= self.incumbent.cutoff():
                break
            if self.control.stop_requested():
                return min(heap[0][0], pruned)
            value, place, left = heapq.heappop(heap)
            value, settled, x = self._cut_node(left, value, at_root=place == 0)
            if settled is None or value >= self.incumbent.cutoff():
                pruned = min(pruned, value)
                continue
            if (settled.allowed.sum(axis=1) == 1).all():
                allocation = self.choice.hubs[settled.allowed.argmax(axis=1)]
                pruned = min(pruned, max(value, self.incumbent.take(allocation)))
                continue
            for child in self._branch(settled, x):
                count += 1
                heapq.heappush(heap, (value, count, child))
        return min(heap[0][0] if heap else np.inf, pruned)

    def _first_centre(self) -> Floats:
        """Return the point the cutting starts from: the plan in hand where its hubs are left, else even."""
        n, k = self.choice.own.shape
        if self.incumbent.allocation is None:
            return np.full((n, k), 1.0 / k)
        centre: Floats = (self.incumbent.allocation[:, None] == self.choice.hubs[None, :]).astype(np.float64)
        return centre

    def _separate(self, point: Floats, x: Floats, eta: Floats) -> int:
        cuts = pair_cuts(self.choice, self.pairs, point, self.left.allowed)
        return self.master.add(cuts, x, eta, VIOLATION)

    def _cut_node(self, left: Left, value: float, at_root: bool) -> tuple[float, Left | None, Floats]:
        """Return the node's bound, what is left of it after fixing, and the last point."""
        x = np.zeros(self.choice.own.shape)
        settled = settle(self.choice, left)
        stalled = 0
        for turn in range(60 if at_root else 6):
            if settled is None:
                return np.inf, None, x
            x, eta = self.master.solve(settled)
            bound = self.master.bound(settled, x)
            limit = self.incumbent.cutoff()
            gained, value = bound.value - value, max(value, bound.value)
            if value >= limit or self.control.stop_requested():
                return value, settled, x
            whole = self._try_plan(x)
            limit = self.incumbent.cutoff()
            settled = self._narrow(settled, bound.if_allocated, bound.hubs.if_closed, limit)
            if settled is None:
                return np.inf, None, x
            if at_root:
                self.root.report(value)
                settled, x, eta = self._shrink(settled, x, eta)
            slow = gained < (0.05 if at_root else 0.15) * (limit - value)
            stalled = stalled + 1 if turn and slow else 0
            if stalled > (2 if at_root else 0) and not whole:
                break
            covers = [] if whole else find_covers(self.choice, x)
            self.master.add_covers(covers)
            added = len(covers)
            if not whole and at_root:
                self.centre = 0.5 * (self.centre + x)
                added += self._separate(0.5 * (x + self.centre), x, eta)
            if not added and not self._separate(np.round(x) if whole else x, x, eta):
                break
            self.master.purge(5 if at_root else 40, self.left)
        return value, settled, x

    def _narrow(self, left: Left, if_allocated: Floats, if_closed: Floats, limit: float) -> Left | None:
        """Rule out allocations and hub states whose bound is at the limit."""
        domain = left.domain
        lower = np.where(if_closed >= limit, 1.0, domain.lower)
        if (lower > domain.upper).any():
            return None
        narrowed = Domain(lower, domain.upper, domain.hubs_min, domain.hubs_max)
        return settle(self.choice, Left(narrowed, left.allowed & (if_allocated < limit)))

    def _shrink(self, left: Left, x: Floats, eta: Floats) -> tuple[Left, Floats, Floats]:
        """Drop the hubs that are closed for good, once enough are; the root's rules hold everywhere."""
        self.left = left
        keep = np.flatnonzero(left.domain.upper > 0.5)
        if len(keep) > 0.85 * len(self.choice.hubs):
            return left, x, eta
        domain = left.domain
        narrowed = Domain(domain.lower[keep], domain.upper[keep], domain.hubs_min, domain.hubs_max)
        self.left = Left(narrowed, left.allowed[:, keep])
        self.choice = restrict_choice(self.choice, keep)
        self.centre = self.centre[:, keep]
        self.master.restrict(self.choice, keep, self.left)
        x, eta = self.master.solve(self.left)
        return self.left, x, eta

    def _try_plan(self, x: Floats) -> bool:
        """Offer the plan nearest to x; return whether x is a plan itself."""
        k = len(self.choice.hubs)
        own = x[self.choice.hubs, np.arange(k)]
        if np.abs(x - np.round(x)).max() <= INTEGER:
            self.incumbent.take(self.choice.hubs[x.argmax(axis=1)])
            return True
        count = int(np.clip(round(float(own.sum())), max(1, self.choice.hubs_min), self.choice.hubs_max))
        opened = np.sort(np.argsort(-own, kind="stable")[:count])
        found = allocate(self.choice, opened, x)
        if found is not None:
            self.incumbent.take(self.choice.hubs[found[1]])
        return False

    def _branch(self, left: Left, x: Floats) -> list[Left]:
        """Return two children: the most undecided hub either way, else a station's choice taken or not."""
        k = len(self.choice.hubs)
        own = x[self.choice.hubs, np.arange(k)]
        free = left.domain.free
        undecided = np.abs(own[free] - 0.5)
        if len(free) and (undecided.min() < 0.5 - INTEGER or np.abs(x - np.round(x)).max() <= INTEGER):
            hub = int(free[undecided.argmin()])
            return [Left(left.domain.with_hub(hub, side), left.allowed) for side in (0.0, 1.0)]
        several = left.allowed.sum(axis=1) > 1
        station = int(np.where(several, x.max(axis=1), 2.0).argmin())
        hub = int(np.where(left.allowed[station], x[station], -1.0).argmax())
        with_it, without = left.allowed.copy(), left.allowed.copy()
        with_it[station] = False
        with_it[station, hub] = True
        without[station, hub] = False
        return [Left(left.domain, with_it), Left(left.domain, without)]


def restrict_choice(choice: Choice, keep: Ints) -> Choice:
    """Return the costs over the hubs at the positions `keep`."""
    return Choice(
        hubs=choice.hubs[keep],
        own=choice.own[:, keep],
        between=choice.between[np.ix_(keep, keep)],
        fixed=choice.fixed[keep],
        forced=choice.forced[keep],
        volume=choice.volume,
        load=choice.load,
        capacity=choice.capacity[keep],
        hubs_min=choice.hubs_min,
        hubs_max=choice.hubs_max,
    )


def _possible(instance: HubInstance, choice: Choice) -> Bools:
    """Return the allocations (n, K) whose links exist where the station's volume needs them."""
    moved: Bools = np.asarray(instance.volume > 0.0)
    sends, receives = np.asarray(moved.any(axis=1)), np.asarray(moved.any(axis=0))
    can_send = np.isfinite(instance.collect[:, choice.hubs]) | ~sends[:, None]
    can_receive = np.isfinite(instance.distribute[choice.hubs].T) | ~receives[:, None]
    # an open hub collects its own volume first
    beside = choice.load[:, None] + choice.load[choice.hubs]
    beside[choice.hubs, np.arange(len(choice.hubs))] = choice.load[choice.hubs]
    fits = beside <= choice.capacity * (1.0 + 1e-9)
    return np.asarray(can_send & can_receive & fits)


def _pair_floor(choice: Choice, pairs: Pairs) -> Floats:
    """Return a lower bound on the pair costs each owner answers for, (n,)."""
    least = min(float(choice.between.min()), 0.0)
    both = choice.volume + choice.volume.T
    floor = np.bincount(pairs.first, both[pairs.first, pairs.second] * least, len(choice.own))
    return floor.astype(np.float64)
