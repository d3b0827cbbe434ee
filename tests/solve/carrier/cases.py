"""Small random carriers that use every rule of the trade."""

from __future__ import annotations

import random
from typing import Any

from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station, Vehicle

CODES = "ABCDEF"


def random_carrier(seed: int) -> Problem:
    """Return a carrier of four to five stations; about every rule turns up in some seed."""
    rng = random.Random(seed)
    count = rng.choice((4, 4, 5))
    codes = CODES[:count]
    place = {code: (rng.uniform(0, 900), rng.uniform(0, 900)) for code in codes}

    def maybe(chance: float, value: Any) -> Any:
        return value if rng.random() < chance else None

    hubs = set(rng.sample(codes, rng.choice((1, 2, 3))))
    goal = rng.choice(("least-cost", "most-profit", "most-profit", "most-volume"))
    stations = tuple(
        Station(
            code,
            may_be_hub=code in hubs,
            must_be_hub=code in hubs and rng.random() < 0.1,
            hub_fixed_cost=rng.choice((0.0, 300.0, 1500.0)),
            hub_setup_cost=rng.choice((0.0, 100.0)),
            hub_capacity=maybe(0.15, rng.uniform(20, 120)),
            transfer_cost=rng.choice((0.0, 2.0)),
            departure_fee=rng.choice((0.0, 15.0)),
            volume_fee=rng.choice((0.0, 1.0)),
            max_departures=maybe(0.15, float(rng.randint(3, 10))),
            min_departures=maybe(0.05, 1.0),
            max_links=maybe(0.15, rng.randint(1, 3)),
        )
        for code in codes
    )
    pairs = [(a, b) for a in codes for b in codes if a != b]
    demands = tuple(
        Demand(
            a,
            b,
            round(rng.uniform(1, 60), 1),
            revenue=round(rng.uniform(20, 140), 1),
            revenue_kept_per_transfer=maybe(0.2, 0.8),
            unserved_cost=maybe(0.3, rng.uniform(5, 60)),
            min_share=rng.choice((0.0, 0.0, 0.0, 0.0, 0.5)),
        )
        for a, b in rng.sample(pairs, rng.randint(4, min(9, len(pairs))))
    )
    listed = rng.random() < 0.3
    links = tuple(
        _link(rng, a, b, place, one_way=rng.random() < 0.2 and listed)
        for i, a in enumerate(codes)
        for b in codes[i + 1 :]
    )
    vehicles = tuple(_vehicle(rng, number) for number in range(rng.choice((1, 2, 2, 3))))
    unserved = None
    if goal == "least-cost" and rng.random() < 0.5:
        unserved = "allowed"
    return Problem(
        stations,
        demands,
        vehicles,
        links,
        settings=Settings(
            links="listed",
            structure=rng.choice(("mixed", "mixed", "hub-and-spoke")),
            hubs_max=maybe(0.2, 1),
            max_transfers=rng.choice((1, 2)),
            max_circuity=maybe(0.5, 2.0),
            collection_factor=rng.choice((1.0, 1.0, 1.2)),
            transfer_factor=rng.choice((1.0, 1.0, 0.6)),
            max_load_factor=rng.choice((1.0, 0.8)),
            unit_cost_per_km=rng.choice((0.0, 0.02)),
            unserved_cost=70.0 if unserved == "allowed" else 0.0,
            min_frequency=maybe(0.15, 2.0),
            max_frequency=maybe(0.15, 4.0),
            goal=goal,  # type: ignore[arg-type]
            unserved=unserved,  # type: ignore[arg-type]
            cost_limit=rng.choice((4000.0, 9000.0)) if goal == "most-volume" else maybe(0.1, 9000.0),
            investment_limit=maybe(0.15, 150.0),
            gap=1e-6,
        ),
    )


def _link(
    rng: random.Random, a: str, b: str, place: dict[str, tuple[float, float]], *, one_way: bool
) -> ListedLink:
    x, y = place[a], place[b]
    return ListedLink(
        a,
        b,
        direction="one-way" if one_way else "both",
        distance_km=round(50.0 + ((x[0] - y[0]) ** 2 + (x[1] - y[1]) ** 2) ** 0.5, 1),
        fixed_cost=rng.choice((0.0, 80.0, 400.0)),
        setup_cost=rng.choice((0.0, 50.0)),
        decision=rng.choice(("may", "may", "may", "may", "may", "must", "never")),
    )


def _vehicle(rng: random.Random, number: int) -> Vehicle:
    capacity = float(rng.choice((12, 19, 34, 50)) + number)
    return Vehicle(
        f"type{number}",
        capacity=capacity,
        speed_kmh=rng.choice((300.0, 600.0)),
        range_km=rng.choice((None, None, 700.0)),
        fixed_minutes=20.0,
        turn_minutes=30.0,
        cost_per_hour=round(6.0 * capacity, 1),
        cost_per_departure=30.0,
        available=rng.choice((None, None, 1, 3)),
        owned=0,
        hours_per_vehicle=rng.choice((6.0, 15.0)),
        cost_per_vehicle=rng.choice((0.0, 150.0)),
        purchase_cost=rng.choice((0.0, 40.0)),
    )
