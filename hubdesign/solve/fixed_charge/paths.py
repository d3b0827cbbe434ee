"""Shortest paths of all commodities at once."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign.solve.fixed_charge.instance import FixedChargeInstance

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: Added to every arc so that no cycle is free and paths can be traced back.
STEP = 1e-9


class PathFinder:
    """Bellman-Ford on (commodity, node) arrays; arcs sorted by head so that minima are slices."""

    def __init__(self, instance: FixedChargeInstance) -> None:
        self.order = np.argsort(instance.head, kind="stable")
        self.tail = instance.tail[self.order]
        self.head = instance.head[self.order]
        self.heads, self.starts = np.unique(self.head, return_index=True)
        self.ends = np.append(self.starts[1:], len(self.head))
        self.block = {int(h): (int(a), int(b)) for h, a, b in zip(self.heads, self.starts, self.ends)}
        self.nodes = instance.nodes
        self.origin, self.destination = instance.origin, instance.destination
        self.rows = np.arange(instance.commodities)

    def lengths(self, cost: Floats) -> Floats:
        """Return distances from each origin, shape (K, n), under `cost` (K, A), >= 0, inf = shut."""
        cost = cost[:, self.order] + STEP
        dist = np.full((len(self.rows), self.nodes), np.inf)
        dist[self.rows, self.origin] = 0.0
        for _ in range(self.nodes):
            reached = np.minimum.reduceat(dist[:, self.tail] + cost, self.starts, axis=1)
            better = np.minimum(dist[:, self.heads], reached)
            if np.array_equal(better, dist[:, self.heads]):
                break
            dist[:, self.heads] = better
        return dist

    def trace(self, cost: Floats, dist: Floats, commodities: Ints) -> list[tuple[int, ...]]:
        """Return the arcs of a shortest path of each of `commodities`, all of which must be reachable."""
        result = []
        for k in commodities.tolist():
            node, arcs = int(self.destination[k]), []
            while node != self.origin[k]:
                first, last = self.block[node]
                arcs_in = self.order[first:last]
                place = int(np.argmin(dist[k, self.tail[first:last]] + (cost[k, arcs_in] + STEP)))
                arcs.append(int(arcs_in[place]))
                node = int(self.tail[first + place])
            result.append(tuple(reversed(arcs)))
        return result
