"""Problems of this kind through the front door: an arc-flow MILP agrees, misfits go elsewhere."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from hubdesign.answer import Status
from hubdesign.network import build_network
from hubdesign.pricing import price
from hubdesign.problem import UNLIMITED, Demand, ListedLink, Problem, Settings, Station, Vehicle
from hubdesign.run import design
from hubdesign.solve.control import Control
from hubdesign.solve.direct import solve_direct
from hubdesign.solve.dispatch import solve
from hubdesign.solve.fixed_charge.adapter import fits, to_instance
from tests.solve.fixed_charge.oracle import optimum_by_milp


def random_problem(seed: int) -> Problem:
    rng = np.random.default_rng(seed)
    names = [f"S{i}" for i in range(6)]
    pairs = [(a, b) for i, a in enumerate(names) for b in names[i + 1 :]]
    both = seed % 2 == 0
    ways = (
        pairs
        if both
        else [(a, b) if rng.random() < 0.5 else (b, a) for a, b in pairs] + [(names[0], names[1])]
    )
    links = tuple(
        ListedLink(
            a,
            b,
            "air" if place < len(pairs) else "road",
            "both" if both else "one-way",
            distance_km=1.0,
            fixed_cost=float(np.round(rng.uniform(10.0, 90.0), 1)),
            unit_cost=float(np.round(rng.uniform(0.5, 4.0), 2)),
            capacity=float(rng.uniform(8.0, 30.0)) if rng.random() < 0.7 else None,
            decision="must" if place == 2 and seed % 3 == 0 else "may",
        )
        for place, (a, b) in enumerate(ways)
    )
    demands = tuple(
        Demand(a, b, float(np.round(rng.uniform(0.0, 9.0), 1)), min_share=1.0 if a == "S0" else 0.0)
        for a in names
        for b in names
        if a != b and rng.random() < 0.35
    )
    stations = tuple(
        Station(
            name,
            may_be_hub=name != "S3",
            must_be_hub=name == "S1" and seed % 4 == 0,
            transfer_cost=0.3 * (seed % 3),
            volume_fee=0.2 * (seed % 2),
        )
        for name in names
    )
    settings = Settings(
        structure="mixed",
        max_transfers=UNLIMITED,
        links="listed",
        unserved="allowed",
        unserved_cost=30.0,
        gap=0.0,
        threads=1,
    )
    return Problem(stations, demands, links=links, settings=settings)


@pytest.mark.parametrize("seed", range(12))
def test_the_front_door_gives_a_verified_optimum(seed: int) -> None:
    problem = random_problem(seed)
    network = build_network(problem)
    assert fits(network)
    best = optimum_by_milp(to_instance(network))
    result = design(problem).design  # verifies every rule and price
    if np.isinf(best):
        assert result.status is Status.INFEASIBLE
        return
    assert result.status is Status.PROVEN
    assert result.method.startswith("fixed-charge")
    assert result.objective == pytest.approx(best, rel=2e-6)
    assert result.objective == pytest.approx(price(network, result).total_cost, rel=1e-12)


@pytest.mark.parametrize("seed", range(4))
def test_the_direct_engine_agrees(seed: int) -> None:
    network = build_network(random_problem(seed))
    mine = solve(network.problem, Control(60.0, gap=0.0), network)
    direct = solve_direct(network, Control(60.0, gap=0.0))
    assert mine.status is direct.status
    if direct.objective is not None:
        assert mine.objective == pytest.approx(direct.objective, rel=2e-6)


def test_a_start_is_never_lost() -> None:
    network = build_network(random_problem(2))
    best = solve(network.problem, Control(60.0, gap=0.0), network)
    again = solve(network.problem, Control(60.0, gap=0.5), network, (best,))
    assert again.objective is not None
    assert best.objective is not None
    assert again.objective <= best.objective * (1 + 1e-9)


MISFITS: dict[str, dict[str, object]] = {
    "structure": {"structure": "hub-and-spoke"},
    "transfers": {"max_transfers": 2},
    "single allocation": {"allocation": "single"},
    "circuity": {"max_circuity": 2.0},
    "goal": {"goal": "most-profit"},
    "transfer factor": {"transfer_factor": 0.7},
    "hub count": {"hubs_max": 2},
    "fewest hubs": {"hubs_min": 3},
    "cost limit": {"cost_limit": 1e6},
    "investment limit": {"investment_limit": 1e6},
}


@pytest.mark.parametrize("change", MISFITS.values(), ids=MISFITS.keys())
def test_settings_that_do_not_fit_are_left_to_other_engines(change: dict[str, object]) -> None:
    assert not fits(build_network(random_problem(1).with_settings(**change)))


@pytest.mark.parametrize(
    "change",
    [
        {"hub_fixed_cost": 5.0},
        {"hub_capacity": 3.0},
        {"collection_capacity": 50.0},
        {"max_links": 2},
        {"max_departures": 9.0},
    ],
    ids=lambda change: next(iter(change)),
)
def test_stations_that_do_not_fit_are_left_to_other_engines(change: dict[str, float]) -> None:
    problem = random_problem(1)
    first = dataclasses.replace(problem.stations[0], **change)  # type: ignore[arg-type]
    assert not fits(build_network(problem.replace(stations=(first, *problem.stations[1:]))))


def test_fleets_hours_and_part_shares_are_left_to_other_engines() -> None:
    problem = random_problem(1)
    assert not fits(build_network(problem.replace(vehicles=(Vehicle("V", 10.0, 500.0),))))
    row = dataclasses.replace(problem.demands[0], volume=1.0, max_hours=3.0)
    assert not fits(build_network(problem.replace(demands=(row, *problem.demands[1:]))))
    row = dataclasses.replace(problem.demands[0], volume=1.0, min_share=0.5)
    assert not fits(build_network(problem.replace(demands=(row, *problem.demands[1:]))))
