"""Tables of how volume travels: itineraries, what is left unserved, and the record of the solve."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from hubdesign import costs
from hubdesign.answer import Design
from hubdesign.itineraries import enumerate_itineraries
from hubdesign.network import DemandArrays, Network
from hubdesign.problem import UNLIMITED
from hubdesign.results.table import Column, Table, build_table
from hubdesign.results.travel import Travel, unserved_volumes

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

ITINERARY_COLUMNS = (
    Column("origin", "text", "", "station where the volume starts"),
    Column("destination", "text", "", "station where it ends"),
    Column("stations", "text", "", "stations in order, blank-separated"),
    Column("modes", "text", "", "mode of each leg, blank-separated"),
    Column("volume", "number", "volume per period", "volume that travels this way"),
    Column("share", "number", "share", "share of the O-D volume"),
    Column("transfers", "integer", "transfers", "interior stops"),
    Column("distance_km", "number", "km", "sum of its legs"),
    Column("od_distance_km", "number", "km", "distance from origin to destination"),
    Column("circuity", "number", "ratio", "distance / O-D distance"),
    Column("hours", "number", "hours", "block times (slowest type allowed) and transfer times"),
    Column("revenue", "number", "money per period", "revenue kept after transfers"),
    Column(
        "cost",
        "number",
        "money per period",
        "unit costs, transfers, volume fees; trips, links, hubs and vehicles are shared and not split",
    ),
)


def itinerary_lengths(network: Network, travel: Travel) -> Floats:
    """Return the length of each flow, km, shape (F,)."""
    return travel.per_flow(network.link.distance_km[network.leg.link[travel.leg]])


def itinerary_hours(network: Network, travel: Travel) -> Floats:
    """Return the time of each flow, h, shape (F,)."""
    leg = network.leg
    waiting = np.where(travel.first, 0.0, network.station.transfer_h[leg.tail[travel.leg]])
    return travel.per_flow(leg.hours[travel.leg] + waiting)


def tabulate_itineraries(network: Network, design: Design, travel: Travel) -> Table:
    """Return every itinerary that carries volume, in order of the demand."""
    codes, data, leg = [row.station for row in network.problem.stations], network.demand, network.leg
    station, demand = network.station, travel.demand
    passing = (
        np.where(travel.first, 0.0, station.transfer_cost[leg.tail[travel.leg]]) * travel.volume[travel.owner]
    )
    fees = station.volume_fee[data.origin[demand]] + station.volume_fee[data.destination[demand]]
    length, od_km = itinerary_lengths(network, travel), data.od_km[demand]
    kept = costs.kept_revenue(data.revenue[demand], data.kept[demand], travel.stops.astype(np.float64))
    apart = travel.moves & np.isfinite(od_km) & (od_km > 0.0)
    values = [
        [codes[i] for i in data.origin[demand]],
        [codes[i] for i in data.destination[demand]],
        [" ".join(codes[i] for i in _stops(network, flow.demand, flow.legs)) for flow in design.flows],
        [" ".join(network.modes[network.link.mode[leg.link[x]]] for x in flow.legs) for flow in design.flows],
        travel.volume,
        [flow.share for flow in design.flows],
        travel.stops,
        length,
        od_km,
        np.where(apart, length / np.where(apart, od_km, 1.0), np.nan),
        itinerary_hours(network, travel),
        travel.volume * kept,
        travel.per_flow(travel.money + passing) + travel.volume * fees * travel.moves,
    ]
    return build_table("itineraries", ITINERARY_COLUMNS, values)


def _stops(network: Network, demand: int, legs: tuple[int, ...]) -> list[int]:
    """Return the stations of an itinerary in order."""
    return [int(network.demand.origin[demand]), *(int(network.leg.head[leg]) for leg in legs)]


UNSERVED_COLUMNS = (
    Column("origin", "text", "", "station where the volume would start"),
    Column("destination", "text", "", "station where it would end"),
    Column("volume", "number", "volume per period", "volume left unserved"),
    Column("od_volume", "number", "volume per period", "all of the O-D demand"),
    Column("reason", "text", "", "no itinerary under the rules, or left by the plan"),
)
NO_ITINERARY = "no itinerary under the rules"
LEFT_BY_PLAN = "left by the plan (no room, or not worth it)"


def tabulate_unserved(network: Network, design: Design) -> Table:
    """Return what is left unserved, in order of the demand."""
    codes, data = [row.station for row in network.problem.stations], network.demand
    rest = unserved_volumes(network, design)
    left = np.flatnonzero(rest > 0.0)
    possible = has_itinerary(network, left)
    values = [
        [codes[i] for i in data.origin[left]],
        [codes[i] for i in data.destination[left]],
        rest[left],
        data.volume[left],
        [LEFT_BY_PLAN if there else NO_ITINERARY for there in possible],
    ]
    return build_table("unserved", UNSERVED_COLUMNS, values)


def has_itinerary(network: Network, demand: Ints) -> Bools:
    """Return whether each of `demand` could travel at all on the candidates, whatever else is open."""
    listed = np.ones(len(demand), dtype=bool)
    possible = np.zeros(len(demand), dtype=bool)
    if network.problem.settings.transfers_at_most == UNLIMITED:
        listed = network.demand.origin[demand] == network.demand.destination[demand]
        possible[~listed] = _reachable(network, demand[~listed])
    if listed.any():
        possible[listed] = _enumerable(network, demand[listed])
    return possible


def _enumerable(network: Network, demand: Ints) -> Bools:
    fields = {name: getattr(network.demand, name)[demand] for name in DemandArrays.__dataclass_fields__}
    found = enumerate_itineraries(replace(network, demand=DemandArrays(**fields)))
    usable = np.append(_usable_legs(network), True)  # a padding entry of -1 reads the last
    possible = np.zeros(len(demand), dtype=bool)
    possible[found.demand[usable[found.legs].all(axis=1)]] = True
    return possible


def _usable_legs(network: Network) -> Bools:
    """Return the legs that the structure can open, shape (L,): hub-and-spoke needs a hub at one end."""
    if network.problem.settings.structure != "hub-and-spoke":
        return np.ones(len(network.leg.link), dtype=bool)
    may = network.station.may_be_hub
    return np.asarray(may[network.leg.tail] | may[network.leg.head])


def _reachable(network: Network, demand: Ints) -> Bools:
    """Return whether a path through stations that may be hubs joins the ends of each of `demand`."""
    usable, may = _usable_legs(network), network.station.may_be_hub
    reach: dict[int, set[int]] = {}
    possible = []
    for origin, destination in zip(
        network.demand.origin[demand].tolist(), network.demand.destination[demand].tolist()
    ):
        if origin not in reach:
            seen, ahead = {origin}, [origin]
            while ahead:
                place = ahead.pop()
                if place != origin and not may[place]:
                    continue
                found = {int(network.leg.head[leg]) for leg in network.legs_from[place] if usable[leg]} - seen
                seen |= found
                ahead.extend(found)
            reach[origin] = seen
        possible.append(destination in reach[origin])
    return np.array(possible, dtype=bool)


PROGRESS_COLUMNS = (
    Column("seconds", "number", "s", "wall time since the solve began"),
    Column("best_plan", "number", "goal", "objective of the best plan so far"),
    Column("bound", "number", "goal", "proven bound on any plan"),
    Column("gap", "number", "share", "difference of the two over the best plan"),
)


def tabulate_progress(design: Design) -> Table:
    """Return the record of the solve."""
    rows = design.progress
    values = [
        [row.seconds for row in rows],
        [row.best for row in rows],
        [row.bound for row in rows],
        [row.gap for row in rows],
    ]
    return build_table("progress", PROGRESS_COLUMNS, values)
