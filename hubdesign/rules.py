"""The rules of a plan, one check_* each, in the order of the written formulation.

Every check returns sentences with figures, empty where the rule is kept. Nothing here knows a solver.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterator

import numpy as np

from hubdesign.answer import Design, Flow
from hubdesign.network import Network
from hubdesign.pricing import Bill
from hubdesign.problem import UNLIMITED
from hubdesign.units import KG_PER_TONNE, SHARE_TOLERANCE

Rule = Callable[[Network, Design, Bill], list[str]]


def _over(value: float, limit: float) -> bool:
    """Whether `value` exceeds `limit` by more than the tolerance."""
    return bool(value > limit + SHARE_TOLERANCE * max(1.0, abs(limit)))


def _code(network: Network, station: int) -> str:
    return network.problem.stations[station].station


def _od(network: Network, demand: int) -> str:
    row = network.problem.demands[demand]
    return f"{row.origin} -> {row.destination}"


def link_name(network: Network, link: int) -> str:
    """Return ``A - B by mode`` (``A -> B`` where one-way)."""
    data = network.link
    joint = "-" if data.both[link] else "->"
    ends = f"{_code(network, int(data.tail[link]))} {joint} {_code(network, int(data.head[link]))}"
    return f"{ends} by {network.modes[int(data.mode[link])]}"


def check_demand_shares(network: Network, design: Design, bill: Bill) -> list[str]:
    """Shares are in 0..1 and sum to at most 1; what must be carried is."""
    settings, data = network.problem.settings, network.demand
    demand = np.array([flow.demand for flow in design.flows], dtype=np.int64)
    share = np.array([flow.share for flow in design.flows])
    told = [
        f"{_od(network, int(k))}: a share of {s:.6g} is outside 0..1"
        for k, s in zip(demand, share)
        if s < -SHARE_TOLERANCE or s > 1 + SHARE_TOLERANCE
    ]
    carried = np.bincount(demand, weights=share, minlength=len(data.volume))
    for k in np.flatnonzero(carried > 1 + SHARE_TOLERANCE).tolist():
        told.append(f"{_od(network, k)}: shares sum to {carried[k]:.9g}, more than 1")
    if settings.structure == "current":
        return told  # today's network carries what fits
    least = data.min_share if settings.unserved_allowed else np.ones(len(data.volume))
    short = (carried < least - SHARE_TOLERANCE) & (data.volume > 0)
    for k in np.flatnonzero(short).tolist():
        told.append(
            f"{_od(network, k)}: {carried[k]:.9g} of the volume is carried, at least {least[k]:g} must be"
        )
    return told


def check_itineraries(network: Network, design: Design, bill: Bill) -> list[str]:
    """Itineraries are simple, joined up, over open links, transferring at open hubs, within every limit."""
    told: list[str] = []
    hubs, links = set(design.hubs), set(design.links)
    for flow in design.flows:
        told += [
            f"{_od(network, flow.demand)}: {fault}" for fault in _path_faults(network, flow, hubs, links)
        ]
    return told


def _path_faults(network: Network, flow: Flow, hubs: set[int], links: set[int]) -> Iterator[str]:
    data, leg = network.demand, network.leg
    origin, destination = int(data.origin[flow.demand]), int(data.destination[flow.demand])
    if not flow.legs:
        if origin != destination or origin not in hubs:
            yield "travels no leg, which only local volume at its own hub may"
        return
    tails, heads = leg.tail[list(flow.legs)].tolist(), leg.head[list(flow.legs)].tolist()
    if tails[0] != origin or heads[-1] != destination or tails[1:] != heads[:-1]:
        yield "the legs do not join origin and destination"
        return
    if any(int(leg.link[entry]) not in links for entry in flow.legs):
        yield "travels a link that is not open"
    inside = heads[:-1]
    places = [origin, *inside] if origin == destination else [origin, *inside, destination]
    if len(set(places)) < len(places):
        yield "visits a station twice"
    if origin == destination and (len(inside) != 1 or origin in hubs):
        yield "local volume goes out to one hub and back, and only from a station that is no hub"
    for station in inside:
        if station not in hubs:
            yield f"transfers at {_code(network, station)}, which is no open hub"
    yield from _limit_faults(network, flow, inside)


def _limit_faults(network: Network, flow: Flow, inside: list[int]) -> Iterator[str]:
    settings, data, leg = network.problem.settings, network.demand, network.leg
    local = data.origin[flow.demand] == data.destination[flow.demand]
    most = settings.transfers_at_most
    if most != UNLIMITED and len(inside) > most:
        yield f"{len(inside)} transfers, at most {most} are allowed"
    legs = list(flow.legs)
    hours = float(leg.hours[legs].sum() + network.station.transfer_h[inside].sum())
    if _over(hours, float(data.max_hours[flow.demand])):
        yield f"takes {hours:.4g} h, at most {data.max_hours[flow.demand]:g} are allowed"
    length, od_km = float(network.link.distance_km[leg.link[legs]].sum()), float(data.od_km[flow.demand])
    circuity = settings.max_circuity
    if circuity is not None and not local and not np.isnan(od_km) and _over(length, circuity * od_km):
        ratio = length / max(od_km, 1e-9)
        yield f"is {length:.6g} km long, {ratio:.4g} times the O-D distance (at most {circuity:g})"


def check_capacity(network: Network, design: Design, bill: Bill) -> list[str]:
    """Volume on each leg is within what departures (or the link) offer."""
    settings = network.problem.settings
    load = settings.max_load_factor if network.problem.has_fleet else 1.0
    told = []
    for leg in np.flatnonzero(bill.leg_volume > 0).tolist():
        offered = load * float(bill.leg_capacity[leg])
        if bill.leg_volume[leg] > offered * (1 + SHARE_TOLERANCE) + 1e-12:
            tail, head = int(network.leg.tail[leg]), int(network.leg.head[leg])
            ends = f"{_code(network, tail)} -> {_code(network, head)}"
            told.append(f"{ends}: volume {bill.leg_volume[leg]:.9g} exceeds what is offered, {offered:.9g}")
    return told


def check_hubs(network: Network, design: Design, bill: Bill) -> list[str]:
    """Hubs may be hubs, must-hubs are open, their number is as asked."""
    station, settings = network.station, network.problem.settings
    told = [f"{_code(network, i)} is a hub but may not be" for i in design.hubs if not station.may_be_hub[i]]
    missing = set(np.flatnonzero(station.must_be_hub).tolist()) - set(design.hubs)
    told += [f"{_code(network, i)} must be a hub but is not" for i in sorted(missing)]
    fewest, most = settings.hub_count
    if len(design.hubs) < fewest or (most is not None and len(design.hubs) > most):
        asked = f"at least {fewest}" if most is None else f"{fewest} to {most}"
        told.append(f"{len(design.hubs)} hubs are open, {asked} are asked for")
    return told


def check_hub_capacities(network: Network, design: Design, bill: Bill) -> list[str]:
    """Volume stopping at a hub, and volume collected by it, within its capacities."""
    told = []
    for what, load, limit in (
        ("transferring volume", bill.passing_volume, network.station.hub_capacity),
        ("collected volume", bill.collected_volume, network.station.collection_capacity),
    ):
        for i in np.flatnonzero(np.isfinite(limit)).tolist():
            if load[i] > limit[i] * (1 + SHARE_TOLERANCE) + 1e-12:
                told.append(f"{_code(network, i)}: {what} {load[i]:.9g} exceeds its capacity {limit[i]:g}")
    return told


def check_links(network: Network, design: Design, bill: Bill) -> list[str]:
    """Must-links are open; no station has more links than it may."""
    missing = sorted(set(np.flatnonzero(network.link.must).tolist()) - set(design.links))
    told = [f"{link_name(network, link)} must be operated but is not" for link in missing]
    count = Counter(
        int(station)
        for link in design.links
        for station in (network.link.tail[link], network.link.head[link])
    )
    for station, links in sorted(count.items()):
        if links > network.station.max_links[station]:
            most = network.station.max_links[station]
            told.append(f"{_code(network, station)}: {links} links are open, at most {most:g} may be")
    return told


def check_structure(network: Network, design: Design, bill: Bill) -> list[str]:
    """Hub-and-spoke: every open link touches an open hub. Point-to-point: no hub."""
    structure, hubs = network.problem.settings.structure, set(design.hubs)
    if structure == "point-to-point" and hubs:
        return ["a hub is open, point-to-point has none"]
    if structure != "hub-and-spoke":
        return []
    return [
        f"{link_name(network, link)} touches no open hub"
        for link in design.links
        if int(network.link.tail[link]) not in hubs and int(network.link.head[link]) not in hubs
    ]


def check_allocation(network: Network, design: Design, bill: Bill) -> list[str]:
    """Single allocation: one open hub each, joined by an open link; ways follow it."""
    if not network.problem.settings.single_allocation:
        return []
    if design.allocation is None:
        return ["single allocation is asked for but no allocation is given"]
    own, hubs, told = design.allocation, set(design.hubs), []
    joined = {frozenset((int(network.link.tail[e]), int(network.link.head[e]))) for e in design.links}
    for i, hub in enumerate(own):
        if i in hubs and hub != i:
            told.append(f"{_code(network, i)} is a hub but belongs to {_code(network, hub)}")
        elif hub not in hubs:
            told.append(f"{_code(network, i)} belongs to {_code(network, hub)}, which is no open hub")
        elif hub != i and frozenset((i, hub)) not in joined:
            told.append(f"no open link joins {_code(network, i)} to its hub {_code(network, hub)}")
    for flow in design.flows:
        if flow.legs and not _follows(network, flow, own, hubs):
            told.append(f"{_od(network, flow.demand)}: the itinerary does not follow the allocation")
    return told


def _follows(network: Network, flow: Flow, own: tuple[int, ...], hubs: set[int]) -> bool:
    origin = int(network.demand.origin[flow.demand])
    destination = int(network.demand.destination[flow.demand])
    stations = [origin, *network.leg.head[list(flow.legs)].tolist()]
    nonstop = len(stations) == 2 and origin not in hubs and destination not in hubs
    if nonstop and origin != destination:
        return network.problem.settings.structure == "mixed"
    asked = [origin, own[origin], own[destination], destination]
    return stations == [s for place, s in enumerate(asked) if place == 0 or s != asked[place - 1]]


def check_frequencies(network: Network, design: Design, bill: Bill) -> list[str]:
    """Departures only on open links, between the least and the most of each link."""
    if not network.problem.has_fleet:
        return []
    total = np.zeros(network.link_count)
    told = []
    for entry in design.frequencies:
        link = int(network.service.link[entry.service])
        total[link] += entry.departures
        if entry.departures < 0:
            told.append(f"{link_name(network, link)}: {entry.departures} departures")
    if network.problem.settings.structure == "current":
        return told
    opened = np.zeros(network.link_count, dtype=bool)
    opened[list(design.links)] = True
    for link in np.flatnonzero((total > 0) & ~opened).tolist():
        told.append(f"{link_name(network, link)} has departures but is not open")
    for link in design.links:
        least, most = float(network.link.min_frequency[link]), float(network.link.max_frequency[link])
        if total[link] < least - SHARE_TOLERANCE or total[link] > most + SHARE_TOLERANCE:
            asked = f"at least {least:g}" if most == np.inf else f"{least:g} to {most:g}"
            told.append(
                f"{link_name(network, link)}: {total[link]:g} departures each way, {asked} are asked for"
            )
    return told


def check_balance(network: Network, design: Design, bill: Bill) -> list[str]:
    """Each type arrives at a station as often as it departs."""
    if network.problem.settings.structure == "current":
        return []
    surplus: Counter[tuple[int, int]] = Counter()
    for entry in design.frequencies:
        link, vehicle = int(network.service.link[entry.service]), int(network.service.vehicle[entry.service])
        if not network.link.both[link]:
            surplus[vehicle, int(network.link.tail[link])] -= entry.departures
            surplus[vehicle, int(network.link.head[link])] += entry.departures
    return [
        f"{_code(network, station)}: arrivals less departures of {network.problem.vehicles[vehicle].vehicle}"
        f" are {count:+d}, not 0"
        for (vehicle, station), count in sorted(surplus.items())
        if count
    ]


def check_departures(network: Network, design: Design, bill: Bill) -> list[str]:
    """Departures at each station between its least and its most."""
    told = []
    for i, count in enumerate(bill.station_departures.tolist()):
        least, most = network.station.min_departures[i], network.station.max_departures[i]
        if count < least - SHARE_TOLERANCE:
            told.append(f"{_code(network, i)}: {count:g} departures, at least {least:g} must be")
        if count > most + SHARE_TOLERANCE:
            told.append(f"{_code(network, i)}: {count:g} departures, at most {most:g} may be")
    return told


def check_vehicles(network: Network, design: Design, bill: Bill) -> list[str]:
    """No more vehicles than available."""
    return [
        f"{row.vehicle}: {bill.vehicle_h[v]:.6g} hours need {bill.vehicles_used[v]} vehicles,"
        f" {row.available} are available"
        for v, row in enumerate(network.problem.vehicles)
        if row.available is not None and bill.vehicles_used[v] > row.available
    ]


def check_ranges(network: Network, design: Design, bill: Bill) -> list[str]:
    """Types fly no link beyond their range."""
    told = []
    for entry in design.frequencies:
        row = network.problem.vehicles[int(network.service.vehicle[entry.service])]
        link = int(network.service.link[entry.service])
        length = float(network.link.distance_km[link])
        if entry.departures > 0 and row.range_km is not None and _over(length, row.range_km):
            beyond = f"{length:.6g} km is beyond {row.vehicle}'s range of {row.range_km:g} km"
            told.append(f"{link_name(network, link)}: {beyond}")
    return told


def check_co2_limit(network: Network, design: Design, bill: Bill) -> list[str]:
    """Emissions within their limit."""
    limit, tonnes = network.problem.settings.co2_limit_tonnes, bill.co2_kg / KG_PER_TONNE
    if limit is not None and _over_limit(tonnes, limit):
        return [f"{tonnes:.9g} t CO2, at most {limit:g} are allowed"]
    return []


def check_money_limits(network: Network, design: Design, bill: Bill) -> list[str]:
    """Total cost and one-off money within their limits."""
    settings, told = network.problem.settings, []
    for what, value, limit in (
        ("total cost", bill.total_cost, settings.cost_limit),
        ("investment", bill.investment, settings.investment_limit),
    ):
        if limit is not None and _over_limit(value, limit):
            told.append(f"{what} {value:.9g} exceeds the limit of {limit:g}")
    return told


def _over_limit(value: float, limit: float) -> bool:
    """Whether a sum exceeds its limit by more than the relative tolerance of solvers."""
    return value > limit + SHARE_TOLERANCE * abs(limit) + 1e-9


#: Rules of a new design, by the row of the formulation they belong to.
DESIGN_RULES: tuple[Rule, ...] = (
    check_demand_shares,
    check_itineraries,
    check_capacity,
    check_hubs,
    check_hub_capacities,
    check_links,
    check_structure,
    check_allocation,
    check_frequencies,
    check_balance,
    check_departures,
    check_vehicles,
    check_ranges,
    check_money_limits,
    check_co2_limit,
)

#: Today's network must obey these ...
CURRENT_RULES: tuple[Rule, ...] = (check_demand_shares, check_itineraries, check_capacity, check_frequencies)

#: ... and is warned of these.
CURRENT_WARNINGS: tuple[Rule, ...] = (
    check_ranges,
    check_vehicles,
    check_departures,
    check_hub_capacities,
    check_co2_limit,
)


def broken(rules: tuple[Rule, ...], network: Network, design: Design, bill: Bill) -> tuple[str, ...]:
    """Return every sentence of `rules`, in their order."""
    return tuple(sentence for rule in rules for sentence in rule(network, design, bill))
