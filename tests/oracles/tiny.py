"""Seeded tiny cases that touch every rule: three or four stations, a handful of links."""

from __future__ import annotations

import random
from typing import Any

from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station, Vehicle


def tiny_case(seed: int, **fixed: Any) -> Problem:
    """Return a random tiny case; `fixed` settings override what the dice say."""
    dice = random.Random(seed)
    fleet = dice.random() < 0.6
    codes = "ABC" if fleet else dice.choice(["ABC", "ABCD"])
    structure = fixed.get("structure", dice.choice(["point-to-point", "hub-and-spoke", "mixed", "mixed"]))
    single = structure != "point-to-point" and fixed.get("allocation", dice.choice("mmms")) in ("single", "s")
    local = dice.random() < 0.3
    modes = ["air", "road"] if dice.random() < 0.3 else ["air"]
    transfers = (
        2
        if single
        else dice.choice([None, 1, 2, -1] if structure == "hub-and-spoke" else [None, 0, 1, 2, -1])
    )
    timed = fleet and transfers != -1
    goal = fixed.get("goal", dice.choice(["least-cost", "most-profit", "most-volume"]))
    settings = {
        "structure": structure,
        "allocation": "single" if single else "multiple",
        "max_transfers": transfers,
        "links": "listed",
        "max_circuity": dice.choice([None, None, 1.5]) if transfers != -1 else None,
        "max_hours": dice.choice([None, None, 4.0]) if timed else None,
        "transfer_minutes": 30.0 if timed else 0.0,
        "hubs_max": dice.choice([None, None, 1]),
        "local_volume": "via-hub" if local else "refuse",
        "max_frequency": dice.choice([None, 2.0]) if fleet else None,
        "max_load_factor": dice.choice([1.0, 0.8]) if fleet else 1.0,
        "unit_cost_per_km": dice.choice([0.0, 0.01]),
        "link_fixed_cost": dice.choice([0.0, 20.0]),
        "link_fixed_cost_per_km": dice.choice([0.0, 0.1]),
        "collection_factor": dice.choice([1.0, 1.5]),
        "transfer_factor": dice.choice([1.0, 0.6]),
        "distribution_factor": dice.choice([1.0, 1.2]),
        "unserved_cost": dice.choice([5.0, 15.0]),
        "revenue_per_unit": dice.choice([0.0, 12.0]),
        "revenue_per_km": dice.choice([0.0, 0.05]),
        "revenue_kept_per_transfer": dice.choice([1.0, 0.8]) if transfers != -1 else 1.0,
        "co2_price_per_tonne": dice.choice([0.0, 50.0]) if fleet else 0.0,
        "goal": goal,
        "unserved": "forbidden" if goal == "least-cost" and dice.random() < 0.5 else "allowed",
        "cost_limit": dice.choice([None, None, 600.0]),
        "investment_limit": dice.choice([None, None, 40.0]),
        "co2_limit_tonnes": dice.choice([None, None, 4.0]) if fleet else None,
        "gap": 0.0,
        "time_limit_s": 30.0,
    }
    settings.update(fixed)
    return Problem(
        tuple(_station(dice, code, fleet, place) for place, code in enumerate(codes)),
        tuple(_demands(dice, codes, local)),
        tuple(_vehicles(dice, modes)) if fleet else (),
        tuple(_links(dice, codes, modes, fleet)),
        settings=Settings(**settings),
    )


def _station(dice: random.Random, code: str, fleet: bool, place: int) -> Station:
    return Station(
        code,
        may_be_hub=place < 2,
        must_be_hub=place < 2 and dice.random() < 0.08,
        hub_fixed_cost=dice.choice([0.0, 30.0, 90.0]),
        hub_setup_cost=dice.choice([0.0, 15.0]),
        hub_capacity=dice.choice([None, None, 12.0]),
        collection_capacity=dice.choice([None, None, None, 25.0]),
        transfer_cost=dice.choice([0.0, 0.5]),
        departure_fee=dice.choice([0.0, 3.0]),
        volume_fee=dice.choice([0.0, 0.3]),
        min_departures=dice.choice([None, None, None, 1.0]) if fleet else None,
        max_departures=dice.choice([None, None, 3.0]) if fleet else None,
        max_links=dice.choice([None, None, None, 2]),
    )


def _demands(dice: random.Random, codes: str, local: bool) -> list[Demand]:
    rows = []
    for a in codes:
        for b in codes:
            if (a != b and dice.random() < 0.6) or (a == b and local and dice.random() < 0.5):
                rows.append(
                    Demand(
                        a,
                        b,
                        float(dice.randint(2, 18)),
                        revenue=dice.choice([None, None, 25.0]),
                        min_share=dice.choice([0.0, 0.0, 0.0, 0.5]),
                        unserved_cost=dice.choice([None, 20.0]),
                    )
                )
    return rows or [Demand("A", "B", 5.0)]


def _vehicles(dice: random.Random, modes: list[str]) -> list[Vehicle]:
    return [
        Vehicle(
            f"type-{mode}",
            capacity=dice.choice([8.0, 20.0]),
            speed_kmh=dice.choice([90.0, 300.0]),
            mode=mode,
            range_km=dice.choice([None, None, 280.0]),
            fixed_minutes=dice.choice([0.0, 20.0]),
            turn_minutes=15.0,
            cost_per_hour=dice.choice([10.0, 40.0]),
            cost_per_departure=dice.choice([3.0, 15.0]),
            cost_per_km=dice.choice([0.0, 0.05]),
            available=dice.choice([None, None, 2]),
            owned=dice.choice([0, 1]),
            hours_per_vehicle=dice.choice([6.0, 20.0]),
            cost_per_vehicle=dice.choice([0.0, 25.0]),
            purchase_cost=dice.choice([0.0, 30.0]),
            fuel_kg_per_km=1.0,
            fuel_kg_per_departure=20.0,
            co2_per_fuel_kg=dice.choice([None, 3.0]) if mode == "air" else 3.1,
        )
        for mode in modes
    ]


def _links(dice: random.Random, codes: str, modes: list[str], fleet: bool) -> list[ListedLink]:
    rows = []
    pairs = [(a, b) for place, a in enumerate(codes) for b in codes[place + 1 :]]
    for a, b in pairs:
        length = float(dice.randint(60, 300))
        for mode in modes:
            if mode == "road" and dice.random() < 0.6:
                continue
            both = dice.random() < 0.75
            ends = [(a, b)] if both or dice.random() < 0.3 else [(a, b), (b, a)]
            for tail, head in ends:
                rows.append(
                    ListedLink(
                        tail,
                        head,
                        mode,
                        "both" if both else "one-way",
                        distance_km=length + (15.0 if mode == "road" else 0.0),
                        fixed_cost=dice.choice([None, None, 12.0]),
                        setup_cost=dice.choice([0.0, 10.0]),
                        unit_cost=dice.choice([None, None, 0.7]),
                        capacity=None if fleet else dice.choice([None, 10.0, 25.0]),
                        decision=dice.choice(["may"] * 8 + ["must", "never"]),
                    )
                )
    return rows[:6] if not fleet else rows[:5]
