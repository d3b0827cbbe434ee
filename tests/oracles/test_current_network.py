"""Today's network, evaluated: against the oracle's flows on the same links, departures and hubs."""

from __future__ import annotations

import dataclasses
import random

import pytest

from hubdesign.answer import Status
from hubdesign.network import build_network
from hubdesign.problem import CurrentLink, Problem
from hubdesign.solve.control import Control
from hubdesign.solve.dispatch import solve
from hubdesign.verification import verify
from tests.oracles.enumeration import BruteForce, Choice
from tests.oracles.tiny import tiny_case


def current_case(seed: int) -> tuple[Problem, BruteForce, Choice]:
    """Return a case with a network of today drawn at random, and the same as the oracle's one choice.

    Station capacities, shares that must be carried and limits only warn of today's network, so they are off.
    """
    dice = random.Random(seed)
    problem = tiny_case(
        seed, allocation="multiple", cost_limit=None, investment_limit=None, co2_limit_tonnes=None
    )
    problem = problem.replace(
        stations=tuple(
            dataclasses.replace(
                row, hub_capacity=None, collection_capacity=None, current_hub=dice.random() < 0.5
            )
            for row in problem.stations
        ),
        demands=tuple(dataclasses.replace(row, min_share=0.0) for row in problem.demands),
    )
    oracle = BruteForce(problem.with_settings(structure="mixed", unserved="allowed"))
    departures: dict[tuple[int, str], int] = {}
    rows, links = [], set()
    for e, link in enumerate(oracle.links):
        if dice.random() < 0.3:
            continue
        turned = link.direction == "both" and dice.random() < 0.5
        ends = (link.to, link.from_) if turned else (link.from_, link.to)
        if problem.has_fleet:
            vehicle = oracle.types_on(link)[0].vehicle
            departures[e, vehicle] = dice.randint(1, 2)
            rows.append(CurrentLink(*ends, vehicle, departures[e, vehicle]))
        elif link.mode == next(r.mode for r in problem.links if {r.from_, r.to} == {link.from_, link.to}):
            rows.append(CurrentLink(*ends))
        else:
            continue
        links.add(e)
    hubs = frozenset(row.station for row in problem.stations if row.current_hub)
    choice = Choice(hubs, frozenset(links), departures)
    return problem.with_settings(structure="current").replace(current=tuple(rows)), oracle, choice


def expected(problem: Problem, oracle: BruteForce, choice: Choice) -> float | None:
    """Return the objective of today's network: where nothing may be left unserved, volume comes first."""
    goal, forbidden = problem.settings.goal, not problem.settings.unserved_allowed
    if goal != "most-volume" and forbidden:
        oracle.s = oracle.s.replace(goal="most-volume")
        value = oracle.value(choice)
        return None if value is None else value[1]
    value = oracle.value(choice)
    return None if value is None else value[0]


@pytest.mark.parametrize("seed", range(7000, 7060))
def test_todays_network_carries_what_the_oracle_carries(seed: int) -> None:
    problem, oracle, choice = current_case(seed)
    network = build_network(problem)
    answer = solve(problem, Control(20.0, gap=0.0), network)
    value = expected(problem, oracle, choice)
    assert value is not None
    assert answer.status is Status.PROVEN
    checked = verify(problem, answer, network)
    assert checked.breaches == ()
    size = max(1.0, abs(checked.bill.total_cost))
    assert answer.objective == pytest.approx(value, rel=1e-6, abs=2e-6 * size)
    assert answer.bound == pytest.approx(answer.objective, rel=2e-9, abs=2e-9 * size)
