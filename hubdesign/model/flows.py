"""Flow columns: how the share of an O-D demand that travels some way touches links, hubs and money.

Two formulations share everything else of the model. *Paths*: a column is an itinerary with the roles of its
two ends. *Legs* (for "unlimited" transfers): a column is a demand on a leg, and conservation rows tie them
together; roles matter only on the first and last leg, so only those have copies. Local volume always
travels on paths.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from hubdesign import costs
from hubdesign.itineraries import MOST_WAYS, Itineraries, too_many_ways
from hubdesign.network import Network
from hubdesign.pricing import leg_factors

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

#: What an end acts as.
ANY, SPOKE, HUB = -1, 0, 1


@dataclass(frozen=True, slots=True)
class Incidence:
    """Pairs (flow column, item): the column touches the item."""

    column: Ints
    item: Ints


@dataclass(frozen=True, slots=True)
class FlowColumns:
    """The x columns; C of them, positions from 0.

    Attributes
    ----------
    demand, origin_role, destination_role
        Per column, shape (C,); roles are ANY, SPOKE or HUB.
    cost, revenue
        Money for the whole demand travelling this way, shape (C,): unit costs, transfers, volume fees.
    on_leg
        Legs used.
    hub_at, spoke_at
        Stations that act as a hub (interior, or an end in that role); ends that act as no hub.
    passing
        Interior stations.
    first_hub
        The first hub touched, where collection is counted.
    of_itinerary
        Itinerary of a path column, -1 for a leg column, shape (C,).
    itineraries
        The paths behind `of_itinerary`.
    roles_matter
        Whether ends were told apart at all.
    """

    demand: Ints
    origin_role: Ints
    destination_role: Ints
    cost: Floats
    revenue: Floats
    on_leg: Incidence
    hub_at: Incidence
    spoke_at: Incidence
    passing: Incidence
    first_hub: Incidence
    of_itinerary: Ints
    itineraries: Itineraries
    roles_matter: bool

    def __len__(self) -> int:
        return len(self.demand)


def roles_matter(network: Network) -> bool:
    """Whether what an end acts as changes a cost or a rule."""
    settings = network.problem.settings
    if not network.station.may_be_hub.any():
        return False
    factors = (settings.collection_factor, settings.transfer_factor, settings.distribution_factor)
    priced = any(factor != 1.0 for factor in factors) and bool((network.link.unit_cost > 0).any())
    counted = bool(np.isfinite(network.station.collection_capacity).any())
    return priced or counted or settings.single_allocation


def build_path_columns(network: Network, itineraries: Itineraries) -> FlowColumns:
    """Return a column for each itinerary and each role its ends may have."""
    matter = roles_matter(network)
    origin = network.demand.origin[itineraries.demand]
    destination = network.demand.destination[itineraries.demand]
    stays = (itineraries.legs[:, 0] < 0) if len(itineraries) else np.zeros(0, dtype=bool)
    copies = []
    for origin_role in _roles(matter):
        for destination_role in _roles(matter):
            allowed = _role_allowed(network, origin, origin_role) & _role_allowed(
                network, destination, destination_role
            )
            local = origin == destination
            # Local volume leaves only a station that is no hub, and stays only where there is one.
            allowed &= ~local | (stays if origin_role == HUB and destination_role == HUB else False)
            copies.append(_copy(np.flatnonzero(allowed), origin_role, destination_role))
    leaves = np.flatnonzero((origin == destination) & ~stays & ~network.station.must_be_hub[origin])
    copies.append(_copy(leaves, SPOKE, SPOKE))
    if not matter:
        copies.append(_copy(np.flatnonzero(stays), HUB, HUB))
    of_itinerary, origin_role_, destination_role_ = (np.concatenate(parts) for parts in zip(*copies))
    order = np.argsort(of_itinerary, kind="stable")
    return _path_figures(
        network, itineraries, of_itinerary[order], origin_role_[order], destination_role_[order], matter
    )


def _roles(matter: bool) -> tuple[int, ...]:
    return (SPOKE, HUB) if matter else (ANY,)


def _copy(itinerary: Ints, origin_role: int, destination_role: int) -> tuple[Ints, Ints, Ints]:
    return itinerary, np.full(len(itinerary), origin_role), np.full(len(itinerary), destination_role)


def _role_allowed(network: Network, station: Ints, role: int) -> Bools:
    if role == HUB:
        return network.station.may_be_hub[station]
    if role == SPOKE:
        return ~network.station.must_be_hub[station]
    return np.ones(len(station), dtype=bool)


def _path_figures(
    network: Network,
    itineraries: Itineraries,
    of_itinerary: Ints,
    origin_role: Ints,
    destination_role: Ints,
    matter: bool,
) -> FlowColumns:
    demand = itineraries.demand[of_itinerary]
    legs, stops = itineraries.legs[of_itinerary], itineraries.hubs[of_itinerary]
    data, station = network.demand, network.station
    origin, destination = data.origin[demand], data.destination[demand]
    last = (legs >= 0).sum(axis=1) - 1
    unit = np.zeros(len(demand))
    leg_cost = np.append(network.link.unit_cost[network.leg.link], 0.0)
    for place in range(3):
        tail_hub = origin_role == HUB if place == 0 else np.ones(len(demand), dtype=bool)
        head_hub = np.where(last == place, destination_role == HUB, True)
        unit += np.where(
            legs[:, place] >= 0, leg_cost[legs[:, place]] * leg_factors(network, tail_hub, head_hub), 0.0
        )
    moves = legs[:, 0] >= 0
    fees = np.where(moves, station.volume_fee[origin] + station.volume_fee[destination], 0.0)
    transfer = np.append(station.transfer_cost, 0.0)[stops].sum(axis=1)
    kept = costs.kept_revenue(
        data.revenue[demand], data.kept[demand], itineraries.transfers[of_itinerary].astype(np.float64)
    )
    columns = np.arange(len(demand), dtype=np.int64)
    interior = _incidence(columns, stops)
    end_hubs = _concatenated(
        Incidence(columns[origin_role == HUB], origin[origin_role == HUB]),
        _without_local(columns, origin, destination, destination_role == HUB),
    )
    end_spokes = _concatenated(
        Incidence(columns[origin_role == SPOKE], origin[origin_role == SPOKE]),
        _without_local(columns, origin, destination, destination_role == SPOKE),
    )
    first = np.where(origin_role == HUB, origin, np.where(stops[:, 0] >= 0, stops[:, 0], -1))
    first = np.where((first < 0) & (destination_role == HUB), destination, first)
    return FlowColumns(
        demand=demand,
        origin_role=origin_role,
        destination_role=destination_role,
        cost=data.volume[demand] * (unit + transfer + fees),
        revenue=data.volume[demand] * kept,
        on_leg=_incidence(columns, legs),
        hub_at=_concatenated(interior, end_hubs),
        spoke_at=end_spokes,
        passing=interior,
        first_hub=Incidence(columns[first >= 0], first[first >= 0]),
        of_itinerary=of_itinerary,
        itineraries=itineraries,
        roles_matter=matter,
    )


def _without_local(columns: Ints, origin: Ints, destination: Ints, chosen: Bools) -> Incidence:
    """Return the destination ends that are not the origin's own entry again."""
    chosen = chosen & (origin != destination)
    return Incidence(columns[chosen], destination[chosen])


def _incidence(columns: Ints, items: Ints) -> Incidence:
    """Return the pairs of a padded (C, width) array, -1 for padding."""
    row, place = np.nonzero(items >= 0)
    return Incidence(columns[row], items[row, place])


def _concatenated(*parts: Incidence) -> Incidence:
    return Incidence(np.concatenate([p.column for p in parts]), np.concatenate([p.item for p in parts]))


def build_leg_columns(network: Network, local: Itineraries) -> FlowColumns:
    """Return a column for each demand and leg it may use ("unlimited" transfers), and paths of local volume.

    A leg into the origin or out of the destination is never on a simple path; a leg whose tail is not the
    origin (head not the destination) needs a station there that may be a hub.
    """
    matter = roles_matter(network)
    if len(network.demand.volume) * len(network.leg.link) > MOST_WAYS:
        hubs = int(network.station.may_be_hub.sum())
        raise too_many_ways("pairs of a demand and a leg, with unlimited transfers,", MOST_WAYS, hubs)
    demand, leg, origin_role, destination_role = _leg_copies(network, matter)
    data, station = network.demand, network.station
    tail, head = network.leg.tail[leg], network.leg.head[leg]
    starts, ends = tail == data.origin[demand], head == data.destination[demand]
    factor = leg_factors(
        network, np.where(starts, origin_role == HUB, True), np.where(ends, destination_role == HUB, True)
    )
    fees = np.where(starts, station.volume_fee[tail], 0.0) + np.where(ends, station.volume_fee[head], 0.0)
    unit = (
        network.link.unit_cost[network.leg.link[leg]] * factor
        + fees
        + np.where(ends, 0.0, station.transfer_cost[head])
    )
    columns = np.arange(len(demand), dtype=np.int64)
    passing = Incidence(columns[~ends], head[~ends])
    hub_ends = _concatenated(
        _end(columns, tail, starts, origin_role, HUB), _end(columns, head, ends, destination_role, HUB)
    )
    spoke_ends = _concatenated(
        _end(columns, tail, starts, origin_role, SPOKE), _end(columns, head, ends, destination_role, SPOKE)
    )
    first = np.where(starts & (origin_role == HUB), tail, -1)
    first = np.where(starts & (first < 0) & (~ends | (destination_role == HUB)), head, first)
    legs = FlowColumns(
        demand=demand,
        origin_role=np.where(starts, origin_role, ANY),
        destination_role=np.where(ends, destination_role, ANY),
        cost=data.volume[demand] * unit,
        revenue=np.where(starts, data.volume[demand] * data.revenue[demand], 0.0),
        on_leg=Incidence(columns, leg),
        hub_at=_concatenated(passing, hub_ends),
        spoke_at=spoke_ends,
        passing=passing,
        first_hub=Incidence(columns[first >= 0], first[first >= 0]),
        of_itinerary=np.full(len(demand), -1),
        itineraries=local,
        roles_matter=matter,
    )
    return _appended(legs, build_path_columns(network, local))


def _leg_copies(network: Network, matter: bool) -> tuple[Ints, Ints, Ints, Ints]:
    """Return (demand, leg, origin role, destination role) of every leg column."""
    tail, head, may = network.leg.tail, network.leg.head, network.station.may_be_hub
    parts: list[tuple[Ints, Ints, Ints, Ints]] = []
    for k, (o, d) in enumerate(zip(network.demand.origin.tolist(), network.demand.destination.tolist())):
        if o == d:
            continue
        usable = (head != o) & (tail != d) & ((tail == o) | may[tail]) & ((head == d) | may[head])
        legs = np.flatnonzero(usable)
        starts, ends = tail[legs] == o, head[legs] == d
        for origin_role in _roles(matter):
            for destination_role in _roles(matter):
                # A role that the leg does not touch exists once, under the first name.
                chosen = (starts | (origin_role == _roles(matter)[0])) & (
                    ends | (destination_role == _roles(matter)[0])
                )
                chosen &= ~starts | _role_allowed(network, np.full(len(legs), o), origin_role)
                chosen &= ~ends | _role_allowed(network, np.full(len(legs), d), destination_role)
                taken = legs[chosen]
                fill = np.full(len(taken), k)
                parts.append(
                    (fill, taken, np.full(len(taken), origin_role), np.full(len(taken), destination_role))
                )
    if not parts:
        empty = np.zeros(0, dtype=np.int64)
        return empty, empty, empty, empty
    demand, leg, origin_role_, destination_role_ = (np.concatenate(part) for part in zip(*parts))
    return demand, leg, origin_role_, destination_role_


def _end(columns: Ints, station: Ints, at_end: Bools, roles: Ints, role: int) -> Incidence:
    chosen = at_end & (roles == role)
    return Incidence(columns[chosen], station[chosen])


def _appended(first: FlowColumns, second: FlowColumns) -> FlowColumns:
    shift = len(first)

    def both(a: Incidence, b: Incidence) -> Incidence:
        return _concatenated(a, Incidence(b.column + shift, b.item))

    return FlowColumns(
        demand=np.concatenate((first.demand, second.demand)),
        origin_role=np.concatenate((first.origin_role, second.origin_role)),
        destination_role=np.concatenate((first.destination_role, second.destination_role)),
        cost=np.concatenate((first.cost, second.cost)),
        revenue=np.concatenate((first.revenue, second.revenue)),
        on_leg=both(first.on_leg, second.on_leg),
        hub_at=both(first.hub_at, second.hub_at),
        spoke_at=both(first.spoke_at, second.spoke_at),
        passing=both(first.passing, second.passing),
        first_hub=both(first.first_hub, second.first_hub),
        of_itinerary=np.concatenate((first.of_itinerary, second.of_itinerary)),
        itineraries=second.itineraries,
        roles_matter=first.roles_matter,
    )
