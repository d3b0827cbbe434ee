"""Results to show: small ones that are solved, and a large one put together by hand."""

from __future__ import annotations

import itertools
import math
import random
from functools import cache

from hubdesign.answer import Design, Flow, Frequency, Progress, Status
from hubdesign.network import build_network
from hubdesign.pricing import price
from hubdesign.problem import Demand, Problem, Settings, Station
from hubdesign.run import Result

LARGE_STATIONS = 100


@cache
def large_result(stations: int = LARGE_STATIONS) -> Result:
    """Return a plan of three hubs with an itinerary and something unserved for every ordered pair."""
    rng = random.Random(7)
    rows = tuple(
        Station(
            f"S{i:03d}",
            name=f"Station number {i}",
            lat=rng.uniform(30.0, 60.0),
            lon=rng.uniform(-10.0, 40.0),
            may_be_hub=i < 3,
        )
        for i in range(stations)
    )
    codes = [row.station for row in rows]
    demands = tuple(Demand(a, b, round(rng.uniform(1.0, 900.0), 2)) for a in codes for b in codes if a != b)
    settings = Settings(
        title="A hundred stations",
        currency="EUR",
        volume_unit="parcels",
        period="night",
        unit_cost_per_km=0.01,
        unserved="allowed",
        unserved_cost=5.0,
        max_transfers=2,
        structure="hub-and-spoke",
    )
    problem = Problem(rows, demands, settings=settings)
    network = build_network(problem)
    ends = {(int(a), int(b)): leg for leg, (a, b) in enumerate(zip(network.leg.tail, network.leg.head))}
    flows, links = [], set()
    for place, demand in enumerate(demands):
        o, d = network.index[demand.origin], network.index[demand.destination]
        stops = [o, o % 3, d % 3, d]
        legs = tuple(ends[a, b] for a, b in itertools.pairwise(stops) if a != b)
        flows.append(Flow(place, legs, 0.9))
        links |= {int(network.leg.link[leg]) for leg in legs}
    draft = Design(
        Status.FEASIBLE,
        hubs=(0, 1, 2),
        links=tuple(sorted(links)),
        flows=tuple(flows),
        progress=(Progress(1.0, 2e8, 5e7), Progress(2.0, 1.5e8, 6e7), Progress(9.0, 1.4e8, 1.2e8)),
        method="put together by hand",
    )
    bill = price(network, draft)
    design = draft.replace(objective=bill.total_cost, bound=0.93 * bill.total_cost)
    return Result(problem, network, design, bill, (), 9.0, 8.0)


def star_result(problem: Problem) -> Result:
    """Return a plan put together by hand: every station at its nearest hub, hubs joined to each other.

    The page must show any plan; nothing is said about how good it is.
    """
    network = build_network(problem)
    n, leg, may = network.station_count, network.leg, network.station.may_be_hub
    ends = {(int(a), int(b)): place for place, (a, b) in enumerate(zip(leg.tail, leg.head))}
    length = network.link.distance_km
    hubs = [i for i in range(n) if may[i]] or [0]

    def nearest(i: int) -> int | None:
        reached = [h for h in hubs if (i, h) in ends]
        return i if i in hubs else min(reached, key=lambda h: length[leg.link[ends[i, h]]], default=None)

    own, flows, load = [nearest(i) for i in range(n)], [], dict.fromkeys(range(len(leg.link)), 0.0)
    for place, demand in enumerate(problem.demands):
        o, d = network.index[demand.origin], network.index[demand.destination]
        stops = [o, own[o], own[d], d]
        pairs = [(a, b) for a, b in itertools.pairwise(stops) if a != b]
        if None in stops or any(pair not in ends for pair in pairs):
            continue
        legs = tuple(ends[pair] for pair in pairs)  # type: ignore[index]
        share = 1.0 if place % 3 else 0.75
        flows.append(Flow(place, legs, share))
        for used in legs:
            load[used] += share * demand.volume
    links = sorted({int(leg.link[place]) for place, volume in load.items() if volume})
    frequencies = []
    for link in links if problem.has_fleet else ():
        service = max(network.services_of[link], key=lambda s: network.service.capacity[s])
        most = max(load[place] for place in range(len(leg.link)) if leg.link[place] == link)
        frequencies.append(Frequency(service, math.ceil(most / network.service.capacity[service])))
    draft = Design(
        Status.FEASIBLE,
        hubs=tuple(h for h in hubs if any(load[p] for p in load if h in (leg.tail[p], leg.head[p]))),
        links=tuple(links),
        frequencies=tuple(sorted(frequencies, key=lambda row: row.service)),
        flows=tuple(flows),
        progress=(Progress(1.0, 1e6, 5e5), Progress(2.0, 9e5, 6e5), Progress(9.0, 8e5, 7e5)),
        method="put together by hand",
    )
    bill = price(network, draft)
    worth = bill.profit if problem.settings.goal == "most-profit" else bill.total_cost
    bound = worth + abs(worth) * (0.05 if problem.settings.goal == "most-profit" else -0.05)
    return Result(problem, network, draft.replace(objective=worth, bound=bound), bill, (), 9.0, 8.0)
