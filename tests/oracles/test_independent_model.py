"""Medium carrier cases against another formulation in another solver."""

from __future__ import annotations

import random

import pytest

from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station, Vehicle
from hubdesign.run import design
from tests.oracles.independent_model import best_profit


def medium_case(seed: int) -> Problem:
    """Return seven stations in a plane, three hub candidates, two types, most profit."""
    dice = random.Random(seed)
    codes = [f"M{i}" for i in range(7)]
    at = {c: (dice.uniform(0, 600), dice.uniform(0, 600)) for c in codes}
    links = []
    for place, a in enumerate(codes):
        for b in codes[place + 1 :]:
            length = ((at[a][0] - at[b][0]) ** 2 + (at[a][1] - at[b][1]) ** 2) ** 0.5
            links.append(ListedLink(a, b, distance_km=round(max(60.0, length), 1)))
    demands = tuple(
        Demand(a, b, float(dice.randint(5, 40)), revenue=float(dice.randint(30, 90)))
        for a in codes
        for b in codes
        if a != b and dice.random() < 0.7
    )
    common = {"turn_minutes": 25.0, "hours_per_vehicle": 60.0}
    vehicles = (
        Vehicle(
            "small", 19.0, 350.0, fixed_minutes=15.0, cost_per_hour=500.0, cost_per_vehicle=700.0, **common
        ),
        Vehicle(
            "large", 46.0, 420.0, fixed_minutes=20.0, cost_per_hour=900.0, cost_per_vehicle=1500.0, **common
        ),
    )
    stations = tuple(
        Station(c, may_be_hub=i < 3, hub_fixed_cost=250.0, transfer_cost=2.0, departure_fee=20.0)
        for i, c in enumerate(codes)
    )
    settings = Settings(
        links="listed",
        max_transfers=seed % 3,
        max_load_factor=0.9,
        link_fixed_cost=120.0,
        unit_cost_per_km=0.01,
        goal="most-profit",
        gap=0.0,
        time_limit_s=60.0,
        threads=1,
    )
    return Problem(stations, demands, vehicles, tuple(links), settings=settings)


@pytest.mark.parametrize("seed", range(3))
def test_two_formulations_in_two_solvers_agree(seed: int) -> None:
    problem = medium_case(seed).with_settings(gap=0.002, time_limit_s=20.0)
    result = design(problem)
    assert result.design.objective is not None
    assert result.design.bound is not None
    profit, bound = best_profit(problem, 10.0)
    # Each solver's plan is below the other's proven bound, whatever it had time to prove.
    assert profit <= result.design.bound * (1 + 1e-6)
    assert result.design.objective <= bound * (1 + 1e-6)


@pytest.mark.benchmark
@pytest.mark.parametrize("seed", range(9))
def test_two_formulations_in_two_solvers_agree_to_the_end(seed: int) -> None:
    problem = medium_case(seed)
    result = design(problem)
    profit, bound = best_profit(problem, 300.0)
    assert result.design.objective == pytest.approx(profit, rel=1e-4)
    assert result.design.objective <= bound * (1 + 1e-6)
