"""Results to show: small ones that are solved, and a large one put together by hand."""

from __future__ import annotations

import itertools
import random
from functools import cache

from hubdesign.design import Design, Flow, Progress, Status
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
