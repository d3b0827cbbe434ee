"""Tables of what is operated: links, stations, vehicles."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from hubdesign import costs
from hubdesign.answer import Design
from hubdesign.network import Network
from hubdesign.pricing import Bill
from hubdesign.results.table import Column, Table, build_table
from hubdesign.results.travel import Travel, hub_flags
from hubdesign.units import MINUTES_PER_HOUR

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

_LINK_ENDS = (
    Column("from", "text", "", "one end (where one-way, the start)"),
    Column("to", "text", "", "the other end"),
    Column("mode", "text", "", "mode of the link"),
    Column("direction", "text", "", "both, or one-way: from -> to only"),
    Column("role", "text", "", "hub-hub, hub-spoke, or nonstop (between stations that are no hubs)"),
    Column("distance_km", "number", "km", "length"),
    Column("frequency", "integer", "departures each way per period", "all vehicle types together"),
)
_LINK_FIGURES = (
    Column(
        "capacity", "number", "volume each way per period", "capacity offered; blank where there is no limit"
    ),
    Column("volume_out", "number", "volume per period", "volume carried from -> to"),
    Column("volume_back", "number", "volume per period", "volume carried to -> from; blank for one-way"),
    Column("load_factor_out", "number", "share", "volume / capacity, from -> to"),
    Column("load_factor_back", "number", "share", "volume / capacity, to -> from"),
    Column("block_minutes", "number", "minutes", "block time, average over its departures"),
    Column("departures", "integer", "departures per period", "both directions together"),
    Column("block_hours", "number", "hours per period", "both directions together"),
    Column("capacity_km", "number", "volume-km per period", "capacity times length (ASK), both directions"),
    Column("volume_km", "number", "volume-km per period", "volume times length (RPK), both directions"),
    Column("link_fixed_cost", "number", "money per period", "cost of operating the link at all"),
    Column("trip_cost", "number", "money per period", "operating cost of its departures"),
    Column("departure_fees", "number", "money per period", "fees of its departures, at both ends"),
    Column("volume_cost", "number", "money per period", "unit costs of the volume on it"),
    Column("co2_cost", "number", "money per period", "price of its emissions"),
    Column("cost", "number", "money per period", "sum of the five"),
    Column("setup_cost", "number", "money once", "one-off cost; 0 for a link operated today"),
    Column("co2_kg", "number", "kg per period", "emissions of its departures"),
)


def link_columns(vehicles: Sequence[str]) -> tuple[Column, ...]:
    """Return the columns of the table of links: a frequency for each vehicle type."""
    by_type = tuple(
        Column(f"frequency_{vehicle}", "integer", "departures each way per period", f"of {vehicle}")
        for vehicle in vehicles
    )
    return (*_LINK_ENDS, *by_type, *_LINK_FIGURES)


def tabulate_links(network: Network, design: Design, bill: Bill, travel: Travel) -> Table:
    """Return the open links."""
    link, codes = network.link, [row.station for row in network.problem.stations]
    opened = np.array(design.links, dtype=np.int64)
    tail, head, out = link.tail[opened], link.head[opened], network.forward_leg[opened]
    back = network.backward_leg[opened]
    by_type, trips = _service_sums(network, design)
    leg_money = np.bincount(travel.leg, weights=travel.money, minlength=len(network.leg.link)).astype(
        np.float64
    )
    leg_fee = bill.leg_departures * network.station.departure_fee[network.leg.tail]

    def both(per_leg: Floats) -> Floats:
        return np.asarray(per_leg[out] + np.where(back >= 0, per_leg[back], 0.0))

    length, hub = link.distance_km[opened], hub_flags(network, design)
    volume_out, volume_back = bill.leg_volume[out], np.where(back >= 0, bill.leg_volume[back], np.nan)
    capacity, departures = bill.leg_capacity[out], both(bill.leg_departures)
    fees, money, offered = both(leg_fee), both(leg_money), both(bill.leg_departures) > 0
    parts = [link.fixed_cost[opened], trips["trip_cost"][opened], fees, money, trips["co2_cost"][opened]]
    capacity_km = (
        both(bill.leg_capacity) * length if network.problem.has_fleet else np.full(len(opened), np.nan)
    )
    values = [
        [codes[i] for i in tail],
        [codes[i] for i in head],
        [network.modes[m] for m in link.mode[opened]],
        ["both" if flag else "one-way" for flag in link.both[opened]],
        [_link_role(bool(hub[i]), bool(hub[j])) for i, j in zip(tail, head)],
        length,
        by_type[opened].sum(axis=1) if network.problem.has_fleet else [None] * len(opened),
        *by_type[opened].T,
        capacity,
        volume_out,
        volume_back,
        _ratio(volume_out, capacity),
        _ratio(volume_back, capacity),
        _ratio(trips["block_h"][opened] * MINUTES_PER_HOUR, np.where(offered, departures, np.nan)),
        departures if network.problem.has_fleet else [None] * len(opened),
        trips["block_h"][opened] if network.problem.has_fleet else [None] * len(opened),
        capacity_km,
        both(bill.leg_volume) * length,
        *parts,
        np.sum(parts, axis=0),
        link.setup_cost[opened],
        trips["co2_kg"][opened],
    ]
    return build_table("links", link_columns([row.vehicle for row in network.problem.vehicles]), values)


def _link_role(tail_is_hub: bool, head_is_hub: bool) -> str:
    if tail_is_hub and head_is_hub:
        return "hub-hub"
    return "hub-spoke" if tail_is_hub or head_is_hub else "nonstop"


def _service_sums(network: Network, design: Design) -> tuple[Ints, dict[str, Floats]]:
    """Return frequencies, shape (E, V), and per link, shape (E,): block hours, trip cost, CO2."""
    service, settings = network.service, network.problem.settings
    frequency = np.zeros((network.link_count, len(network.problem.vehicles)), dtype=np.int64)
    names = ("block_h", "trip_cost", "co2_kg")
    sums = {name: np.zeros(network.link_count) for name in names}
    for entry in design.frequencies:
        link = int(service.link[entry.service])
        frequency[link, service.vehicle[entry.service]] += entry.departures
        trips = entry.departures * float(network.ways[link])
        for name in names:
            sums[name][link] += trips * float(getattr(service, name)[entry.service])
    sums["co2_cost"] = costs.co2_cost(sums["co2_kg"], settings.co2_price_per_tonne)
    return frequency, sums


STATION_COLUMNS = (
    Column("station", "text", "", "code"),
    Column("name", "text", "", "name for people"),
    Column("lat", "number", "degrees", "latitude, WGS 84"),
    Column("lon", "number", "degrees", "longitude, WGS 84"),
    Column("role", "text", "", "hub, spoke (has an open link), or not served"),
    Column("allocated_to", "text", "", "its hub under single allocation (a hub its own)"),
    Column("starting_volume", "number", "volume per period", "volume carried that starts here"),
    Column("ending_volume", "number", "volume per period", "volume carried that ends here"),
    Column("local_volume", "number", "volume per period", "starts or ends here: the sum of the two"),
    Column("transferring_volume", "number", "volume per period", "for which this is an interior stop"),
    Column("collected_volume", "number", "volume per period", "whose first hub this is"),
    Column("departures", "number", "departures per period", "from here"),
    Column("links", "integer", "links", "open links here"),
    Column("hub_fixed_cost", "number", "money per period", "cost of the open hub"),
    Column("transfer_cost", "number", "money per period", "of the volume that transfers here"),
    Column("departure_fees", "number", "money per period", "of departures from here"),
    Column("volume_fees", "number", "money per period", "of volume that starts or ends here"),
    Column("hub_setup_cost", "number", "money once", "one-off cost of the open hub; 0 for today's hubs"),
)


def tabulate_stations(network: Network, design: Design, bill: Bill, travel: Travel) -> Table:
    """Return every station in the order of the inputs."""
    rows, station, n = network.problem.stations, network.station, network.station_count
    hub = hub_flags(network, design)
    ends = np.concatenate([network.link.tail[list(design.links)], network.link.head[list(design.links)]])
    links = np.bincount(ends, minlength=n)
    origin, destination = network.demand.origin[travel.demand], network.demand.destination[travel.demand]
    starting = np.bincount(origin, weights=travel.volume, minlength=n)
    ending = np.bincount(destination, weights=travel.volume, minlength=n)
    moving = travel.volume * travel.moves
    charged = np.bincount(origin, weights=moving, minlength=n) + np.bincount(
        destination, weights=moving, minlength=n
    )
    hub_of = design.allocation
    values = [
        [row.station for row in rows],
        [row.name or row.station for row in rows],
        station.lat,
        station.lon,
        ["hub" if hub[i] else "spoke" if links[i] else "not served" for i in range(n)],
        [None] * n if hub_of is None else [rows[h].station for h in hub_of],
        starting,
        ending,
        starting + ending,
        bill.passing_volume,
        bill.collected_volume,
        bill.station_departures if network.problem.has_fleet else [None] * n,
        links,
        np.where(hub, station.hub_fixed_cost, 0.0),
        bill.passing_volume * station.transfer_cost,
        bill.station_departures * station.departure_fee,
        charged * station.volume_fee,
        np.where(hub, station.hub_setup_cost, 0.0),
    ]
    return build_table("stations", STATION_COLUMNS, values)


VEHICLE_COLUMNS = (
    Column("vehicle", "text", "", "vehicle type"),
    Column("mode", "text", "", "mode it belongs to"),
    Column("used", "integer", "vehicles", "vehicles needed; 0 where hours_per_vehicle is not given"),
    Column("owned", "integer", "vehicles", "vehicles already there"),
    Column("purchased", "integer", "vehicles", "used beyond the owned"),
    Column("departures", "integer", "departures per period", "of this type, both directions"),
    Column("vehicle_km", "number", "km per period", "distance driven or flown"),
    Column("block_hours", "number", "hours per period", "block time"),
    Column("turn_hours", "number", "hours per period", "ground time between departures"),
    Column("vehicle_hours", "number", "hours per period", "block and turn"),
    Column("hours_available", "number", "hours per period", "hours of the vehicles used"),
    Column("capacity_km", "number", "volume-km per period", "capacity times distance (ASK)"),
    Column("trip_cost", "number", "money per period", "operating cost of its departures"),
    Column("vehicle_cost", "number", "money per period", "cost of the vehicles used"),
    Column("cost", "number", "money per period", "sum of the two"),
    Column("purchase_cost", "number", "money once", "one-off cost of the vehicles purchased"),
    Column("co2_kg", "number", "kg per period", "emissions of its departures"),
)


def tabulate_vehicles(network: Network, design: Design, bill: Bill) -> Table:
    """Return every vehicle type in the order of the inputs; no row without a fleet."""
    rows, service = network.problem.vehicles, network.service
    per_service = np.zeros(len(service.link))
    for entry in design.frequencies:
        per_service[entry.service] = entry.departures * network.ways[service.link[entry.service]]

    def by_type(per_trip: Floats | float) -> Floats:
        return np.bincount(service.vehicle, weights=per_service * per_trip, minlength=len(rows)).astype(
            np.float64
        )

    length = network.link.distance_km[service.link]
    trip_cost = by_type(service.trip_cost)
    vehicle_cost = np.array([row.cost_per_vehicle for row in rows]) * bill.vehicles_used
    hours = np.array([np.nan if row.hours_per_vehicle is None else row.hours_per_vehicle for row in rows])
    values = [
        [row.vehicle for row in rows],
        [row.mode for row in rows],
        bill.vehicles_used,
        [row.owned for row in rows],
        bill.vehicles_purchased,
        by_type(1.0),
        by_type(length),
        bill.vehicle_block_h,
        bill.vehicle_h - bill.vehicle_block_h,
        bill.vehicle_h,
        hours * bill.vehicles_used,
        by_type(service.capacity * length),
        trip_cost,
        vehicle_cost,
        trip_cost + vehicle_cost,
        np.array([row.purchase_cost for row in rows]) * bill.vehicles_purchased,
        by_type(service.co2_kg),
    ]
    return build_table("vehicles", VEHICLE_COLUMNS, values)


def _ratio(part: Floats, whole: Floats) -> Floats:
    """Return ``part / whole``; NaN where there is no whole."""
    known = np.isfinite(whole) & (whole > 0)
    return np.where(known, part / np.where(known, whole, 1.0), np.nan)
