"""A plan priced without a solver: every cost part and total of a Problem and its Design."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from hubdesign import costs
from hubdesign.answer import Design
from hubdesign.network import Network

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Bill:
    """Money per period (positive = cost), totals, and the loads they come from.

    Attributes
    ----------
    operating, volume, transfer, hub_fixed, link_fixed, vehicle, departure_fees, volume_fees, co2, unserved
        The cost split: trips; unit costs on legs; interior stops; open hubs; open links; vehicles used;
        departures; volume at its ends; emissions; volume left unserved.
    revenue
        Revenue kept after transfers.
    hub_setup, link_setup, purchase
        One-off money.
    volume_carried, volume_unserved
        O-D volume, each unit once.
    volume_km, capacity_km
        RPK and ASK of the trade: volume (capacity) times the length of each leg travelled.
    leg_volume, leg_departures, leg_capacity
        Per leg, shape (L,); capacity is offered before the load factor limit, inf where none applies.
    passing_volume, collected_volume
        Per station, shape (n,): volume for which it is an interior stop; whose first hub it is.
    station_departures
        Per station, shape (n,).
    vehicle_block_h, vehicle_h, vehicles_used, vehicles_purchased
        Per type, shape (V,): block hours, block and turn hours, vehicles, vehicles beyond the owned.
    """

    operating: float
    volume: float
    transfer: float
    hub_fixed: float
    link_fixed: float
    vehicle: float
    departure_fees: float
    volume_fees: float
    co2: float
    unserved: float
    revenue: float
    hub_setup: float
    link_setup: float
    purchase: float
    volume_carried: float
    volume_unserved: float
    transfers: float
    volume_km: float
    capacity_km: float
    vehicle_km: float
    departures: float
    block_h: float
    co2_kg: float
    leg_volume: Floats
    leg_departures: Floats
    leg_capacity: Floats
    passing_volume: Floats
    collected_volume: Floats
    station_departures: Floats
    vehicle_block_h: Floats
    vehicle_h: Floats
    vehicles_used: Ints
    vehicles_purchased: Ints

    #: Names of the parts of :attr:`total_cost`, in the order people read them.
    PARTS = (
        "operating",
        "volume",
        "transfer",
        "hub_fixed",
        "link_fixed",
        "vehicle",
        "departure_fees",
        "volume_fees",
        "co2",
        "unserved",
    )

    @property
    def total_cost(self) -> float:
        """Sum of the cost parts, money per period."""
        return float(sum(getattr(self, part) for part in self.PARTS))

    @property
    def profit(self) -> float:
        """Revenue kept less total cost, money per period."""
        return self.revenue - self.total_cost

    @property
    def investment(self) -> float:
        """One-off money: hub and link setup, purchases."""
        return self.hub_setup + self.link_setup + self.purchase


def price(network: Network, design: Design) -> Bill:
    """Return the bill of a plan; its rules are checked elsewhere."""
    parts: dict[str, object] = {}
    parts.update(_price_trips(network, design))
    parts.update(_price_flows(network, design))
    hubs, links = np.array(design.hubs, dtype=np.int64), np.array(design.links, dtype=np.int64)
    parts["hub_fixed"] = float(network.station.hub_fixed_cost[hubs].sum())
    parts["hub_setup"] = float(network.station.hub_setup_cost[hubs].sum())
    parts["link_fixed"] = float(network.link.fixed_cost[links].sum())
    parts["link_setup"] = float(network.link.setup_cost[links].sum())
    return Bill(**{field.name: parts[field.name] for field in fields(Bill)})  # type: ignore[arg-type]


def _price_trips(network: Network, design: Design) -> dict[str, object]:
    """Price departures, vehicles and emissions."""
    problem, service, link = network.problem, network.service, network.link
    chosen = np.array([entry.service for entry in design.frequencies], dtype=np.int64)
    count = np.array([entry.departures for entry in design.frequencies], dtype=np.float64)
    of_link, vehicle = service.link[chosen], service.vehicle[chosen]
    trips = count * network.ways[of_link]
    leg_departures, leg_offer = np.zeros(len(network.leg.link)), np.zeros(len(network.leg.link))
    back = network.backward_leg[of_link]
    for legs, there in ((network.forward_leg[of_link], np.ones(len(back), bool)), (back, back >= 0)):
        np.add.at(leg_departures, legs[there], count[there])
        np.add.at(leg_offer, legs[there], (count * service.capacity[chosen])[there])
    station_departures = np.bincount(
        network.leg.tail, weights=leg_departures, minlength=network.station_count
    ).astype(np.float64)
    types = len(problem.vehicles)
    block_h = np.bincount(vehicle, weights=trips * service.block_h[chosen], minlength=types).astype(
        np.float64
    )
    busy_h = np.bincount(vehicle, weights=trips * service.vehicle_h[chosen], minlength=types).astype(
        np.float64
    )
    used = np.array(
        [vehicles_needed(busy_h[v], row.hours_per_vehicle) for v, row in enumerate(problem.vehicles)]
    )
    owned = np.array([row.owned for row in problem.vehicles], dtype=np.int64)
    bought = np.maximum(0, used - owned).astype(np.int64)
    co2_kg = float((trips * service.co2_kg[chosen]).sum())
    capacity = leg_offer if problem.vehicles else link.capacity[network.leg.link]
    length = link.distance_km[network.leg.link]
    return {
        "operating": float((trips * service.trip_cost[chosen]).sum()),
        "vehicle": float(sum(v.cost_per_vehicle * int(used[k]) for k, v in enumerate(problem.vehicles))),
        "purchase": float(sum(v.purchase_cost * int(bought[k]) for k, v in enumerate(problem.vehicles))),
        "departure_fees": float((station_departures * network.station.departure_fee).sum()),
        "co2": costs.co2_cost(co2_kg, problem.settings.co2_price_per_tonne),
        "co2_kg": co2_kg,
        "departures": float(trips.sum()),
        "block_h": float(block_h.sum()),
        "capacity_km": float((leg_offer * length).sum()),
        "vehicle_km": float((leg_departures * length).sum()),
        "leg_departures": leg_departures,
        "leg_capacity": capacity,
        "station_departures": station_departures,
        "vehicle_block_h": block_h,
        "vehicle_h": busy_h,
        "vehicles_used": used.astype(np.int64),
        "vehicles_purchased": bought,
    }


def vehicles_needed(busy_h: float, hours_per_vehicle: float | None) -> int:
    """Return how many vehicles work `busy_h` hours; 0 where a vehicle's hours are not given."""
    if hours_per_vehicle is None:
        return 0
    return int(np.ceil(busy_h / hours_per_vehicle - 1e-9))


def _price_flows(network: Network, design: Design) -> dict[str, object]:
    """Price volume on its way: legs by role, stops, fees, revenue, what is left unserved."""
    data, station, leg = network.demand, network.station, network.leg
    demand = np.array([flow.demand for flow in design.flows], dtype=np.int64)
    share = np.array([flow.share for flow in design.flows], dtype=np.float64)
    volume = data.volume[demand] * share
    stops = np.array([max(0, len(flow.legs) - 1) for flow in design.flows], dtype=np.float64)
    moves = np.array([bool(flow.legs) for flow in design.flows], dtype=bool)
    hub = np.zeros(network.station_count, dtype=bool)
    hub[list(design.hubs)] = True
    owner, legs, first, last = leg_entries(design)
    tail_hub = ~first | hub[leg.tail[legs]]
    head_hub = ~last | hub[leg.head[legs]]
    carried = volume[owner]
    unit = network.link.unit_cost[leg.link[legs]] * leg_factors(network, tail_hub, head_hub)
    passing = np.bincount(leg.tail[legs[~first]], weights=carried[~first], minlength=network.station_count)
    collected = np.zeros(network.station_count)
    first_hub = _first_hubs(network, design, hub)
    counted = first_hub >= 0
    np.add.at(collected, first_hub[counted], volume[counted])
    leg_volume = np.bincount(legs, weights=carried, minlength=len(leg.link)).astype(np.float64)
    served = np.bincount(demand, weights=share, minlength=len(data.volume))
    rest = data.volume * np.clip(1.0 - served, 0.0, 1.0)
    rest[np.abs(1.0 - served) <= 1e-12] = 0.0
    fees = station.volume_fee[data.origin[demand]] + station.volume_fee[data.destination[demand]]
    kept = costs.kept_revenue(data.revenue[demand], data.kept[demand], stops)
    return {
        "volume": float((carried * unit).sum()),
        "transfer": float((passing * station.transfer_cost).sum()),
        "volume_fees": float((volume * fees)[moves].sum()),
        "unserved": float((rest * data.unserved_cost).sum()),
        "revenue": float((volume * kept).sum()),
        "volume_carried": float(volume.sum()),
        "volume_unserved": float(rest.sum()),
        "transfers": float((volume * stops).sum()),
        "volume_km": float((leg_volume * network.link.distance_km[leg.link]).sum()),
        "leg_volume": leg_volume,
        "passing_volume": passing.astype(np.float64),
        "collected_volume": collected,
    }


def leg_entries(design: Design) -> tuple[Ints, Ints, NDArray[np.bool_], NDArray[np.bool_]]:
    """Return (flow, leg, is the first leg, is the last leg) of every leg travelled."""
    sizes = np.array([len(flow.legs) for flow in design.flows], dtype=np.int64)
    owner = np.repeat(np.arange(len(sizes)), sizes)
    legs = np.array([leg for flow in design.flows for leg in flow.legs], dtype=np.int64)
    ends = np.cumsum(sizes)
    first, last = np.zeros(len(legs), dtype=bool), np.zeros(len(legs), dtype=bool)
    first[(ends - sizes)[sizes > 0]] = True
    last[ends[sizes > 0] - 1] = True
    return owner, legs, first, last


def leg_factors(network: Network, tail_hub: NDArray[np.bool_], head_hub: NDArray[np.bool_]) -> Floats:
    """Return :func:`hubdesign.costs.leg_factor` for whole arrays of roles."""
    settings = network.problem.settings
    factors = (settings.collection_factor, settings.transfer_factor, settings.distribution_factor)
    table = np.array(
        [[costs.leg_factor(tail, head, *factors) for head in (False, True)] for tail in (False, True)]
    )
    return np.asarray(table[tail_hub.astype(np.int64), head_hub.astype(np.int64)])


def _first_hubs(network: Network, design: Design, hub: NDArray[np.bool_]) -> Ints:
    """Return the first hub of each flow, -1 for a nonstop between non-hubs."""
    leg, data = network.leg, network.demand
    result = np.full(len(design.flows), -1, dtype=np.int64)
    for place, flow in enumerate(design.flows):
        origin, destination = int(data.origin[flow.demand]), int(data.destination[flow.demand])
        if hub[origin] or not flow.legs:
            result[place] = origin
        elif len(flow.legs) > 1:
            result[place] = leg.head[flow.legs[0]]
        elif hub[destination]:
            result[place] = destination
    return result
