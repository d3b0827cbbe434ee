"""Variables of the model, one add_* per family, with bounds and money."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign import costs
from hubdesign.itineraries import LIMIT_TOLERANCE
from hubdesign.model.layout import Model
from hubdesign.network import Network
from hubdesign.pricing import vehicles_needed

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


def add_hub_variables(model: Model) -> None:
    """h_i: station i is a hub."""
    station = model.network.station
    model.program.add_columns(
        "hub",
        station.must_be_hub.astype(np.float64),
        station.may_be_hub.astype(np.float64),
        integer=True,
        label=model.station_label,
        expressions={"cost": station.hub_fixed_cost, "investment": station.hub_setup_cost},
    )


def add_link_variables(model: Model) -> None:
    """y_e: link e is operated. A link that no way uses and nothing demands stays shut."""
    link = model.network.link
    useful = np.zeros(model.network.link_count, dtype=bool)
    useful[model.network.leg.link[model.flows.on_leg.item]] = True
    if model.network.problem.settings.single_allocation or needs_empty_trips(model.network):
        useful[:] = True
    must = link.must.astype(np.float64)
    model.program.add_columns(
        "link",
        must,
        np.maximum(must, useful.astype(np.float64)),
        integer=True,
        label=model.link_label,
        expressions={"cost": link.fixed_cost, "investment": link.setup_cost},
    )


def add_allocation_variables(model: Model) -> None:
    """a_ih, i != h: station i belongs to hub h; h_h stands for a_hh. None without single allocation."""
    if not model.network.problem.settings.single_allocation:
        return
    station, hub = model.pairs
    upper = (~model.network.station.must_be_hub[station]).astype(np.float64)
    model.program.add_columns(
        "allocation",
        np.zeros(len(station)),
        upper,
        integer=True,
        label=lambda member: (
            f"{model.station_label(int(station[member]))}>{model.station_label(int(hub[member]))}"
        ),
    )


def add_frequency_variables(model: Model) -> None:
    """n_s: departures each way of a type on a link, bounded by what demand can need."""
    network = model.network
    service, link = network.service, network.link
    both = link.both[service.link]
    ways = network.ways[service.link].astype(np.float64)
    fees = network.station.departure_fee[link.tail[service.link]]
    fees = fees + np.where(both, network.station.departure_fee[link.head[service.link]], 0.0)
    co2_kg = ways * service.co2_kg
    emission = costs.co2_cost(co2_kg, network.problem.settings.co2_price_per_tonne)
    today = network.problem.settings.structure == "current"
    model.program.add_columns(
        "frequency",
        network.departures_today.astype(np.float64) if today else np.zeros(len(ways)),
        network.departures_today.astype(np.float64) if today else most_departures(model),
        integer=True,
        label=model.service_label,
        expressions={"cost": ways * service.trip_cost + fees + emission, "co2": co2_kg},
    )


def needs_empty_trips(network: Network) -> bool:
    """Whether trips without volume can be needed: for balance on one-way links, or for min_departures."""
    return bool(network.problem.vehicles) and (
        not bool(network.link.both.all()) or bool((network.station.min_departures > 0).any())
    )


def most_departures(model: Model) -> Floats:
    """Return an upper bound on n_s in some best plan, shape (S,).

    A type needs no more departures than carry all volume that could use the link, or than min_frequency;
    more only cost. Where departures must equal arrivals over one-way links a circulation of a type
    splits into cycles, each with a departure that volume needs, so no link sees more than all needs
    together; min_departures adds its own.
    """
    network = model.network
    service, link = network.service, network.link
    if not len(service.link):
        return np.zeros(0)
    load = network.problem.settings.max_load_factor
    heaviest = _heaviest_leg_volume(model)[service.link]
    minimum = np.ceil(link.min_frequency - LIMIT_TOLERANCE)[service.link]
    need = np.maximum(np.ceil(heaviest / (load * service.capacity) * (1 + 1e-12)), minimum)
    if needs_empty_trips(network):
        one_way = ~link.both[service.link]
        need = need + float(need[one_way].sum()) + float(np.ceil(network.station.min_departures).sum())
    return np.minimum(need, np.floor(link.max_frequency[service.link] + LIMIT_TOLERANCE))


def _heaviest_leg_volume(model: Model) -> Floats:
    """Return, per link, the most volume that could ever travel one of its directions."""
    network, flows = model.network, model.flows
    volume = network.demand.volume[flows.demand[flows.on_leg.column]]
    keys = flows.on_leg.item * len(network.demand.volume) + flows.demand[flows.on_leg.column]
    _, first = np.unique(keys, return_index=True)
    on_leg = np.zeros(len(network.leg.link))
    np.add.at(on_leg, flows.on_leg.item[first], volume[first])
    result = np.zeros(network.link_count)
    np.maximum.at(result, network.leg.link, on_leg)
    return result


def add_vehicle_variables(model: Model) -> None:
    """m_v: vehicles used, b_v: purchases; 0 for a type whose hours per vehicle are not given."""
    vehicles = model.network.problem.vehicles
    today = model.network.problem.settings.structure == "current"
    frequency = model.family("frequency")
    fewest = vehicles_for(model, model.program.lower[frequency.members])
    most = vehicles_for(model, model.program.upper[frequency.members])
    if not today:
        available = [np.inf if row.available is None else float(row.available) for row in vehicles]
        fewest, most = np.zeros(len(vehicles)), np.minimum(most, np.array(available))
    owned = np.array([float(row.owned) for row in vehicles])

    def label(member: int) -> str:
        return vehicles[member].vehicle

    model.program.add_columns(
        "vehicles",
        fewest,
        most,
        integer=True,
        label=label,
        expressions={"cost": np.array([row.cost_per_vehicle for row in vehicles], dtype=np.float64)},
    )
    model.program.add_columns(
        "purchases",
        np.maximum(0.0, fewest - owned),
        np.maximum(0.0, most - owned),
        integer=True,
        label=label,
        expressions={"investment": np.array([row.purchase_cost for row in vehicles], dtype=np.float64)},
    )


def vehicles_for(model: Model, departures: Floats) -> Floats:
    """Return how many vehicles of each type work `departures` (each way, per service)."""
    network = model.network
    service, vehicles = network.service, network.problem.vehicles
    hours_h = np.zeros(len(vehicles))
    np.add.at(hours_h, service.vehicle, service.vehicle_h * network.ways[service.link] * departures)
    needed = [vehicles_needed(float(hours_h[v]), row.hours_per_vehicle) for v, row in enumerate(vehicles)]
    return np.array(needed, dtype=np.float64)


def add_unserved_variables(model: Model) -> None:
    """s_k: share of demand k left unserved; 0 where that is forbidden, 1 where no way exists."""
    data, settings = model.network.demand, model.network.problem.settings
    today = settings.structure == "current"
    allowed = settings.unserved_allowed or today
    most = np.ones(len(data.volume)) if today else 1.0 - data.min_share
    # A demand of no volume needs no way; leaving it out costs and carries nothing.
    upper = np.where(data.volume == 0.0, 1.0, most if allowed else 0.0)
    model.program.add_columns(
        "unserved",
        np.zeros(len(upper)),
        upper,
        integer=False,
        label=model.demand_label,
        expressions={"cost": data.volume * data.unserved_cost, "unserved": data.volume},
    )


def add_flow_variables(model: Model) -> None:
    """x_p: share of the demand that travels way p."""
    flows = model.flows
    model.program.add_columns(
        "flow",
        np.zeros(len(flows)),
        np.ones(len(flows)),
        integer=False,
        label=model.flow_label,
        expressions={"cost": flows.cost, "revenue": flows.revenue},
    )
