"""Best-first branching on hubs over the root's rows; cuts found at a node hold everywhere."""

from __future__ import annotations

import heapq

import numpy as np

from hubdesign.solve.control import Control
from hubdesign.solve.hub_location.instance import Floats
from hubdesign.solve.hub_location.master import Domain
from hubdesign.solve.hub_location.root import VIOLATION, Incumbent, Root

#: Rounds of cuts at a node.
ROUNDS = 5
#: A hub this near to 0 or 1 counts as decided by the relaxation.
INTEGER = 1e-6


def search_tree(root: Root, incumbent: Incumbent, control: Control, bound: float) -> float:
    """Return the scaled bound after branching to the end, or to the limit."""
    heap: list[tuple[float, int, Domain]] = [(bound, 0, root.domain)]
    pruned, count = np.inf, 0
    while heap:
        lowest = heap[0][0]
        root.report(min(lowest, pruned))
        if lowest >= incumbent.cutoff():
            break
        if control.stop_requested():
            return min(lowest, pruned)
        value, _, domain = heapq.heappop(heap)
        value, domain, z = _cut_node(root, incumbent, domain, value)
        if value >= incumbent.cutoff():
            pruned = min(pruned, value)
            continue
        free = domain.free
        opened = int((domain.lower > 0.5).sum())
        if not len(free) or opened == domain.hubs_max or len(free) + opened == domain.hubs_min:
            chosen = domain.lower > 0.5
            if opened != domain.hubs_max:
                chosen[free] = True
            pruned = min(pruned, max(value, incumbent.offer(root.core.hubs[chosen])))
            continue
        hub = int(free[np.argmin(np.abs(z[free] - 0.5) - 1e-9 * z[free])])
        for side in (0.0, 1.0):
            count += 1
            heapq.heappush(heap, (value, count, domain.with_hub(hub, side)))
    left = heap[0][0] if heap else np.inf
    return min(left, pruned)


def _cut_node(root: Root, incumbent: Incumbent, domain: Domain, value: float) -> tuple[float, Domain, Floats]:
    """Return the node's bound, its domain after fixing, and the last point."""
    for turn in range(ROUNDS):
        z, eta = root.master.solve(domain)
        bound = root.master.bound(domain)
        gained = bound.value - value
        value = max(value, bound.value)
        limit = incumbent.cutoff()
        if value >= limit:
            break
        whole = np.abs(z - np.round(z)).max() <= INTEGER
        if whole:
            incumbent.offer(root.core.hubs[z > 0.5])
        lower = np.where(bound.if_closed >= limit, 1.0, domain.lower)
        upper = np.where(bound.if_open >= limit, 0.0, domain.upper)
        if (lower > upper).any():
            return np.inf, domain, z
        domain = Domain(lower, upper, domain.hubs_min, domain.hubs_max)
        if turn and not whole and gained < 0.1 * (limit - value):
            break
        point = np.round(z) if whole else z
        cuts = root.cuts_at(point, domain.upper > 0.5)
        if not root.master.add(cuts, z, eta, VIOLATION, keep_duals=False):
            break
    return value, domain, z
