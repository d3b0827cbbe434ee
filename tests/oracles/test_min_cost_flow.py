"""Single-commodity cases with integer data against networkx' min-cost flow."""

from __future__ import annotations

import random

import networkx as nx
import pytest

from hubdesign.answer import Status
from hubdesign.problem import Demand, ListedLink, Problem, Settings, Station
from hubdesign.run import design


def flow_case(seed: int) -> tuple[Problem, nx.DiGraph]:
    """Return one demand over capacitated one-way links at unit costs, any number of transfers."""
    dice = random.Random(seed)
    codes = [f"N{i}" for i in range(8)]
    volume = dice.randint(4, 12)
    links, graph = [], nx.DiGraph()
    for a in codes:
        for b in codes:
            if a == b or dice.random() > 0.45:
                continue
            cost, capacity = dice.randint(1, 20), dice.randint(1, 8)
            links.append(
                ListedLink(a, b, direction="one-way", distance_km=1.0, unit_cost=cost, capacity=capacity)
            )
            graph.add_edge(a, b, weight=cost, capacity=capacity)
    graph.add_node(codes[0], demand=-volume)
    graph.add_node(codes[-1], demand=volume)
    problem = Problem(
        tuple(Station(code, may_be_hub=True) for code in codes),
        (Demand(codes[0], codes[-1], float(volume)),),
        links=tuple(links),
        settings=Settings(links="listed", max_transfers=-1, gap=0.0, threads=1, unserved_cost=1000.0),
    )
    return problem, graph


def test_routing_costs_what_min_cost_flow_costs() -> None:
    feasible = 0
    for seed in range(25):
        problem, graph = flow_case(seed)
        try:
            cost = nx.min_cost_flow_cost(graph)
        except nx.NetworkXUnfeasible:
            continue
        result = design(problem)
        assert result.design.status is Status.PROVEN
        assert result.bill.total_cost == pytest.approx(cost, rel=1e-6), seed
        feasible += 1
    assert feasible >= 10


def test_what_is_carried_at_the_most_is_the_maximum_flow() -> None:
    for seed in range(25, 40):
        problem, graph = flow_case(seed)
        demand = problem.demands[0]
        limit = nx.maximum_flow_value(graph, demand.origin, demand.destination)
        result = design(problem.with_settings(goal="most-volume"))
        assert result.bill.volume_carried == pytest.approx(min(limit, demand.volume), abs=1e-6), seed
