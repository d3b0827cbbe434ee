"""Problems of this kind through the front door: the direct engine agrees, and misfits are left to it."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from hubdesign.answer import Status
from hubdesign.network import build_network
from hubdesign.pricing import price
from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station, Vehicle
from hubdesign.solve.control import Control
from hubdesign.solve.direct import solve_direct
from hubdesign.solve.dispatch import solve
from hubdesign.solve.hub_location.adapter import fits, solve_hub_location


def random_problem(seed: int, allocation: str) -> Problem:
    rng = np.random.default_rng(seed)
    n = 5
    names = [f"S{i}" for i in range(n)]
    xy = rng.uniform(0.0, 100.0, (n, 2))
    local = seed % 2 == 0
    stations = tuple(
        Station(
            name,
            may_be_hub=bool(rng.random() < 0.8) or i == 0,
            must_be_hub=i == 1 and seed % 5 == 0,
            hub_fixed_cost=float(rng.uniform(0.0, 800.0)) if seed % 3 else 0.0,
            transfer_cost=float(rng.uniform(0.0, 5.0)) if seed % 4 == 1 else 0.0,
            volume_fee=0.0 if local else 2.0,
            collection_capacity=float(rng.uniform(100.0, 250.0))
            if allocation == "single" and seed % 3 == 2
            else None,
        )
        for i, name in enumerate(names)
    )
    links = tuple(
        ListedLink(names[i], names[j], mode, distance_km=factor * float(np.hypot(*(xy[i] - xy[j]))))
        for i in range(n)
        for j in range(i + 1, n)
        for mode, factor in (("air", 1.0), ("road", float(rng.uniform(0.8, 1.2))))
    )
    demands = tuple(
        Demand(names[i], names[j], float(np.round(rng.uniform(0.0, 20.0), 2)))
        for i in range(n)
        for j in range(n)
        if i != j or local
    )
    settings = Settings(
        structure="hub-and-spoke",
        allocation=allocation,  # type: ignore[arg-type]
        hubs_min=int(rng.integers(0, 2)),
        hubs_max=int(rng.integers(2, 4)),
        links="listed",
        local_volume="via-hub" if local else "refuse",
        unit_cost_per_km=1.0,
        collection_factor=float(rng.choice([1.0, 2.0])),
        transfer_factor=float(rng.choice([0.3, 0.75, 1.0])),
        distribution_factor=float(rng.choice([1.0, 1.5])),
        gap=0.0,
    )
    return Problem(stations, demands, links=links, settings=settings)


@pytest.mark.parametrize("allocation", ["multiple", "single"])
def test_the_direct_engine_finds_the_same_optimum(allocation: str) -> None:
    for seed in range(6):
        network = build_network(random_problem(seed, allocation))
        assert fits(network)
        ours = solve_hub_location(network, Control(gap=0.0))
        direct = solve_direct(network, Control(gap=0.0))
        assert ours.has_plan == direct.has_plan
        if not ours.has_plan:
            assert ours.status is direct.status is Status.INFEASIBLE
            continue
        assert ours.status is Status.PROVEN
        assert ours.objective == pytest.approx(direct.objective, rel=1e-6)
        assert ours.bound is not None
        assert ours.bound <= ours.objective
        assert price(network, ours).total_cost == pytest.approx(ours.objective, rel=1e-12)


def test_dispatch_sends_these_problems_here() -> None:
    answer = solve(random_problem(1, "multiple"), Control(gap=0.0))
    assert answer.method.startswith("hub location")


def test_a_plan_to_start_from_is_never_left_behind() -> None:
    network = build_network(random_problem(3, "single"))
    best = solve_hub_location(network, Control(gap=0.0))
    stopped = Control(gap=0.0, time_limit_s=0.0)
    again = solve_hub_location(network, stopped, (best,))
    assert again.objective == pytest.approx(best.objective)


@pytest.mark.parametrize(
    "changes",
    [
        {"structure": "mixed"},
        {"goal": "most-profit"},
        {"unserved": "allowed", "unserved_cost": 5.0},
        {"max_circuity": 1.5},
        {"max_transfers": 1},
        {"cost_limit": 1e9},
        {"investment_limit": 1e9},
        {"link_fixed_cost": 1.0},
        {"max_hours": 5.0},
    ],
)
def test_other_rules_are_left_to_the_direct_engine(changes: dict[str, object]) -> None:
    problem = random_problem(1, "multiple")
    assert not fits(build_network(problem.with_settings(**changes)))


def test_unlimited_transfers_are_served_where_no_detour_is_cheaper() -> None:
    problem = random_problem(2, "multiple").with_settings(max_transfers=-1)
    air = tuple(link for link in problem.links if link.mode == "air")
    squared = tuple(dataclasses.replace(link, distance_km=(link.distance_km or 0.0) ** 2) for link in air)
    assert not fits(build_network(problem.replace(links=squared)))
    network = build_network(problem.replace(links=air))
    assert fits(network)
    ours = solve_hub_location(network, Control(gap=0.0))
    direct = solve_direct(network, Control(gap=0.0))
    assert ours.objective == pytest.approx(direct.objective, rel=1e-6)


def test_a_fleet_is_left_to_the_direct_engine() -> None:
    fleet = (Vehicle("small", 50.0, 700.0),)
    assert not fits(build_network(random_problem(1, "multiple").replace(vehicles=fleet)))


@pytest.mark.parametrize("name", ["hub_capacity", "collection_capacity", "max_links"])
def test_station_limits_are_left_to_the_direct_engine(name: str) -> None:
    problem = random_problem(1, "multiple")
    first = dataclasses.replace(problem.stations[0], **{name: 10})
    assert not fits(build_network(problem.replace(stations=(first, *problem.stations[1:]))))
