"""Fixed-charge capacitated network design as arrays: the question and the answer of this engine.

Open links e at ``fixed_cost``; carry every commodity k from its origin to its destination over the arcs of
open links, split over paths as needed, at least cost (Magnanti and Wong 1984, Transportation Science
18:1-55).
"""

from __future__ import annotations

import enum
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class FixedChargeInstance:
    """Nodes, links, arcs and commodities.

    Attributes
    ----------
    nodes
        Number of nodes n.
    fixed_cost, must_open
        Per link, shape (E,): money if open, >= 0; whether it has to be.
    link, tail, head, unit_cost, capacity
        Per arc (a direction of a link), shape (A,); money per unit of volume, >= 0; volume, inf without a
        limit. The arcs of a two-way link share one fixed cost, each has its own capacity.
    through
        Per node, shape (n,): whether volume may pass through; origins and destinations need not be.
    transfer_cost
        Per node, shape (n,): money per unit of volume that passes through, >= 0.
    origin, destination, volume
        Per commodity, shape (K,); volume > 0, origin and destination differ.
    unserved_cost
        Per commodity, shape (K,): money per unit not carried; inf where all must be.
    carried_cost
        Per commodity, shape (K,): money per unit carried, whatever its path, >= 0.
    """

    nodes: int
    fixed_cost: Floats
    must_open: Bools
    link: Ints
    tail: Ints
    head: Ints
    unit_cost: Floats
    capacity: Floats
    through: Bools
    transfer_cost: Floats
    origin: Ints
    destination: Ints
    volume: Floats
    unserved_cost: Floats
    carried_cost: Floats

    @property
    def links(self) -> int:
        """Number of links E."""
        return len(self.fixed_cost)

    @property
    def arcs(self) -> int:
        """Number of arcs A."""
        return len(self.link)

    @property
    def commodities(self) -> int:
        """Number of commodities K."""
        return len(self.volume)

    def usable(self) -> Bools:
        """Return which arcs a simple path of each commodity may use, shape (K, A).

        Costs are not negative, so some best plan uses simple paths only: none enters its origin or leaves
        its destination, and none passes through a node that does not allow it.
        """
        o, d = self.origin[:, None], self.destination[:, None]
        starts = (self.tail[None, :] == o) | self.through[self.tail][None, :]
        ends = (self.head[None, :] == d) | self.through[self.head][None, :]
        result: Bools = (self.head[None, :] != o) & (self.tail[None, :] != d) & starts & ends
        return result

    def leg_costs(self) -> Floats:
        """Return the cost of carrying all of a commodity over an arc, money, shape (K, A).

        The transfer cost of an arc's tail is in it; for the origin, what carrying costs on any path.
        """
        passes = self.tail[None, :] != self.origin[:, None]
        at_tail = np.where(passes, self.transfer_cost[self.tail][None, :], self.carried_cost[:, None])
        unit = self.unit_cost[None, :] + at_tail
        result: Floats = self.volume[:, None] * unit
        return result


class FixedChargeStatus(enum.Enum):
    """How a solve ended."""

    PROVEN = "proven"
    FEASIBLE = "feasible"
    INFEASIBLE = "infeasible"
    UNKNOWN = "unknown"


@dataclass(frozen=True, slots=True)
class FixedChargeAnswer:
    """The best plan and its proof.

    Attributes
    ----------
    open
        Per link, whether it is open, shape (E,).
    paths
        (commodity, arcs in order, share 0..1), shares of a commodity sum to 1 less what is not carried.
    objective, bound
        Money; the bound is rounded outward.
    """

    status: FixedChargeStatus
    open: Bools
    paths: tuple[tuple[int, tuple[int, ...], float], ...]
    objective: float
    bound: float
