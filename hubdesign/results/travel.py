"""Who travels where in a design: every leg of every itinerary with what it carries and costs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from hubdesign.answer import Design
from hubdesign.network import Network
from hubdesign.pricing import leg_entries, leg_factors

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Travel:
    """The flows of a design as arrays.

    Attributes
    ----------
    demand, volume, stops, moves
        Per flow, shape (F,): its demand, volume carried, interior stations, whether it has a leg at all.
    owner, leg, first
        Per leg travelled, shape (T,): the flow it belongs to, the leg, whether it is the flow's first.
    money
        Per leg travelled, shape (T,): its unit cost times the volume, by the roles of its ends.
    """

    demand: Ints
    volume: Floats
    stops: Ints
    moves: Bools
    owner: Ints
    leg: Ints
    first: Bools
    money: Floats

    def per_flow(self, per_leg_travelled: Floats) -> Floats:
        """Return sums over the legs of each flow, shape (F,)."""
        return np.bincount(self.owner, weights=per_leg_travelled, minlength=len(self.demand)).astype(
            np.float64
        )


def trace_travel(network: Network, design: Design) -> Travel:
    """Return the flows of `design` as arrays."""
    leg = network.leg
    demand = np.array([flow.demand for flow in design.flows], dtype=np.int64)
    volume = network.demand.volume[demand] * np.array([flow.share for flow in design.flows], dtype=np.float64)
    hub = hub_flags(network, design)
    owner, legs, first, last = leg_entries(design)
    # Interior stations act as hubs, ends by what they are.
    factor = leg_factors(network, ~first | hub[leg.tail[legs]], ~last | hub[leg.head[legs]])
    return Travel(
        demand=demand,
        volume=volume,
        stops=np.array([max(0, len(flow.legs) - 1) for flow in design.flows], dtype=np.int64),
        moves=np.array([bool(flow.legs) for flow in design.flows], dtype=bool),
        owner=owner,
        leg=legs,
        first=first,
        money=network.link.unit_cost[leg.link[legs]] * factor * volume[owner],
    )


def hub_flags(network: Network, design: Design) -> Bools:
    """Return whether each station is an open hub, shape (n,)."""
    hub = np.zeros(network.station_count, dtype=bool)
    hub[list(design.hubs)] = True
    return hub


def unserved_volumes(network: Network, design: Design) -> Floats:
    """Return what each demand has left unserved, shape (K,); shares within 1e-12 of all are all."""
    served = np.zeros(len(network.demand.volume))
    for flow in design.flows:
        served[flow.demand] += flow.share
    rest = np.clip(1.0 - served, 0.0, 1.0)
    rest[rest <= 1e-12] = 0.0
    return np.asarray(network.demand.volume * rest)
