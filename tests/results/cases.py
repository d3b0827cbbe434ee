"""Cases with a design whose figures were worked out by hand, and a few that are solved."""

from __future__ import annotations

import random

from hubdesign.answer import Design, Flow, Frequency, Progress, Status
from hubdesign.network import Network, build_network
from hubdesign.pricing import Bill, price
from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station, Vehicle
from hubdesign.solve.control import Control
from hubdesign.solve.dispatch import solve

#: Hand-worked: two links over a hub, three itineraries, a type of vehicle. See test_results.py.
HAND = Problem(
    stations=(
        Station("A", name="Alder", lat=10.0, lon=20.0),
        Station(
            "H",
            lat=11.0,
            lon=23.0,
            may_be_hub=True,
            hub_fixed_cost=100.0,
            hub_setup_cost=3000.0,
            transfer_cost=2.0,
            transfer_minutes=30.0,
            departure_fee=10.0,
            volume_fee=1.0,
        ),
        Station("B", lat=12.0, lon=28.0),
        Station("X", lat=50.0, lon=50.0),
    ),
    demands=(
        Demand("A", "B", 60.0, revenue=100.0),
        Demand("B", "A", 30.0, revenue=100.0),
        Demand("A", "H", 20.0, revenue=100.0),
        Demand("B", "H", 10.0, revenue=100.0),
        Demand("A", "X", 5.0, revenue=100.0),
    ),
    vehicles=(
        Vehicle(
            "prop",
            capacity=50.0,
            speed_kmh=800.0,
            fixed_minutes=20.0,
            turn_minutes=40.0,
            cost_per_hour=1000.0,
            cost_per_departure=100.0,
            cost_per_km=1.0,
            owned=1,
            hours_per_vehicle=10.0,
            cost_per_vehicle=500.0,
            purchase_cost=9000.0,
            fuel_kg_per_km=2.0,
            fuel_kg_per_departure=100.0,
        ),
    ),
    links=(
        ListedLink("A", "H", distance_km=400.0, setup_cost=70.0),
        ListedLink("H", "B", distance_km=600.0),
        ListedLink("A", "B", distance_km=900.0),
    ),
    settings=Settings(
        title="Three towns",
        currency="crowns",
        volume_unit="seats",
        period="day",
        links="listed",
        goal="most-profit",
        link_fixed_cost=7.0,
        unit_cost_per_km=0.01,
        transfer_factor=0.5,
        distribution_factor=2.0,
        revenue_kept_per_transfer=0.9,
        unserved_cost=5.0,
        co2_price_per_tonne=50.0,
    ),
)


def hand_worked() -> tuple[Network, Design, Bill]:
    """Return the hand-worked network, its design and bill."""
    network = build_network(HAND)
    ends = {(int(a), int(b)): leg for leg, (a, b) in enumerate(zip(network.leg.tail, network.leg.head))}
    links = [int(network.leg.link[ends[0, 1]]), int(network.leg.link[ends[1, 2]])]
    services = [network.services_of[link][0] for link in links]
    design = Design(
        status=Status.FEASIBLE,
        objective=-8956.0 - 1.0 / 15.0,
        bound=-8000.0,
        hubs=(1,),
        links=tuple(sorted(links)),
        frequencies=tuple(Frequency(service, 2) for service in sorted(services)),
        flows=(
            Flow(0, (ends[0, 1], ends[1, 2]), 0.5),
            Flow(1, (ends[2, 1], ends[1, 0]), 1.0),
            Flow(2, (ends[0, 1],), 1.0),
        ),
        progress=(Progress(0.1, None, -7000.0), Progress(0.25, -9000.0, -8000.0)),
        method="by hand",
    )
    return network, design, price(network, design)


def random_case(seed: int, **settings: object) -> Problem:
    """Return six stations about the antimeridian with two types, some hubs and forty O-D rows at most."""
    rng = random.Random(seed)
    codes = [f"S{i}" for i in range(6)]
    stations = tuple(
        Station(
            code,
            lat=rng.uniform(-25.0, 5.0),
            lon=(rng.uniform(165.0, 200.0) + 180.0) % 360.0 - 180.0,
            may_be_hub=i < 3,
            hub_fixed_cost=rng.uniform(0.0, 3000.0),
            transfer_cost=rng.uniform(0.0, 5.0),
            departure_fee=rng.uniform(0.0, 200.0),
            volume_fee=rng.uniform(0.0, 3.0),
        )
        for i, code in enumerate(codes)
    )
    demands = tuple(Demand(a, b, rng.uniform(5.0, 120.0)) for a in codes for b in codes if a != b)
    vehicles = (
        Vehicle(
            "small",
            19.0,
            450.0,
            fixed_minutes=25.0,
            cost_per_hour=900.0,
            hours_per_vehicle=70.0,
            cost_per_vehicle=2000.0,
        ),
        Vehicle(
            "large",
            70.0,
            600.0,
            fixed_minutes=30.0,
            turn_minutes=40.0,
            cost_per_hour=2600.0,
            cost_per_km=1.5,
            hours_per_vehicle=80.0,
            cost_per_vehicle=5000.0,
            owned=1,
            purchase_cost=1e6,
            fuel_kg_per_km=3.0,
        ),
    )
    base = Settings(
        goal="most-profit",
        revenue_per_unit=60.0,
        revenue_per_km=0.12,
        revenue_kept_per_transfer=0.9,
        unit_cost_per_km=0.01,
        transfer_factor=0.7,
        link_fixed_cost=100.0,
        unserved_cost=1.0,
        co2_price_per_tonne=40.0,
        time_limit_s=10.0,
        gap=0.05,
    )
    return Problem(stations, demands, vehicles, settings=base.replace(**settings))


def solved(problem: Problem) -> tuple[Network, Design, Bill]:
    """Return the network of `problem`, a design found within its limits, and the bill."""
    network = build_network(problem)
    settings = problem.settings
    control = Control(settings.time_limit_s, settings.gap, 1, settings.seed, settings.goal != "least-cost")
    design = solve(problem, control, network)
    assert design.has_plan, design.reasons
    return network, design, price(network, design)
