"""The solver against brute force over everything whole: tiny cases of every structure, goal, allocation."""

from __future__ import annotations

import pytest

from hubdesign.answer import Status
from hubdesign.network import build_network
from hubdesign.solve.control import Control
from hubdesign.solve.dispatch import solve
from hubdesign.verification import verify
from tests.oracles.enumeration import MOST_DEPARTURES, BruteForce
from tests.oracles.tiny import tiny_case

KINDS = [
    (structure, goal, allocation)
    for structure in ("point-to-point", "hub-and-spoke", "mixed")
    for goal in ("least-cost", "most-profit", "most-volume")
    for allocation in ("multiple", "single")
    if not (structure == "point-to-point" and allocation == "single")
]


def compare_with_brute_force(seed: int, **fixed: object) -> str:
    """Return the status after holding the solver's answer against the oracle's.

    The oracle tries at most MOST_DEPARTURES of a type on a link; max_frequency holds the solver to as many.
    """
    problem = tiny_case(seed, **fixed)
    if problem.has_fleet:
        problem = problem.with_settings(max_frequency=float(MOST_DEPARTURES))
    network = build_network(problem)
    answer = solve(problem, Control(time_limit_s=30.0, gap=0.0), network)
    best = BruteForce(problem).best()
    if best is None:
        assert answer.status is Status.INFEASIBLE, (
            f"seed {seed}: {answer.objective} where nothing is feasible"
        )
        return "infeasible"
    assert answer.status is Status.PROVEN, f"seed {seed}: {answer.status}, brute force {best.objective}"
    checked = verify(problem, answer, network)
    assert checked.breaches == (), f"seed {seed}: {checked.breaches}"
    size = max(1.0, checked.bill.total_cost)
    assert answer.objective == pytest.approx(best.objective, rel=1e-6, abs=2e-6 * size), f"seed {seed}"
    if best.cost_with_volume is not None:
        assert checked.bill.total_cost == pytest.approx(best.cost_with_volume, rel=1e-5, abs=1e-5 * size), (
            seed
        )
    return "proven"


@pytest.mark.parametrize(("structure", "goal", "allocation"), KINDS, ids="-".join)
def test_the_solver_equals_brute_force(structure: str, goal: str, allocation: str) -> None:
    start = 100 * KINDS.index((structure, goal, allocation))
    outcomes = [
        compare_with_brute_force(seed, structure=structure, goal=goal, allocation=allocation)
        for seed in range(start, start + 5)
    ]
    assert "proven" in outcomes


@pytest.mark.benchmark
@pytest.mark.parametrize("seed", range(5000, 5400))
def test_the_solver_equals_brute_force_on_many_more(seed: int) -> None:
    compare_with_brute_force(seed)
