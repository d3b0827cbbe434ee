"""compare: the optimum of every structure lies in its interval, that of every difference in the one told."""

from __future__ import annotations

import itertools

import pytest

from hubdesign.answer import Status
from hubdesign.comparison import compare
from tests.oracles.enumeration import MOST_DEPARTURES, BruteForce
from tests.oracles.tiny import tiny_case


@pytest.mark.parametrize("seed", range(8000, 8040))
def test_intervals_hold_the_optima_of_brute_force(seed: int) -> None:
    problem = tiny_case(seed, structure="mixed", local_volume="via-hub" if seed % 3 == 0 else "refuse")
    if seed % 3:
        demands = tuple(row for row in problem.demands if row.origin != row.destination)
        problem = problem.replace(demands=demands)
    assert problem.demands
    most = float(MOST_DEPARTURES) if problem.has_fleet else None
    # A wide gap leaves room between plan and bound, so that mixed's bound is used for the others.
    problem = problem.with_settings(gap=0.2, threads=1, max_frequency=most, max_transfers=2)
    optimum: dict[str, float] = {}
    entries = {entry.structure: entry for entry in compare(problem).entries}
    for structure, entry in entries.items():
        best = BruteForce(problem.with_settings(structure=structure)).best()
        if best is None:
            assert entry.status is Status.INFEASIBLE, structure
            assert entry.interval is None
            continue
        if not any(row.may_be_hub for row in problem.stations) and structure == "hub-and-spoke":
            continue
        assert entry.comparable, f"{structure}: {entry.note}"
        assert entry.interval is not None
        low, high = entry.interval
        assert entry.result is not None
        slack = 2e-6 * max(1.0, abs(entry.result.bill.total_cost))
        assert low - slack <= best.objective <= high + slack, structure
        optimum[structure] = best.objective
    for row in compare(problem).differences:
        if row.first in optimum and row.second in optimum:
            slack = 1e-5 * max(1.0, *(abs(v) for v in optimum.values()))
            assert row.low - slack <= optimum[row.first] - optimum[row.second] <= row.high + slack
    sign = 1.0 if problem.settings.goal == "least-cost" else -1.0
    told = [
        e.result.design.objective for e in entries.values() if e.interval is not None and e.result is not None
    ]
    mixed = entries["mixed"].result
    forced = any(r.must_be_hub for r in problem.stations) or problem.settings.allocation == "single"
    if entries["mixed"].interval is not None and mixed is not None and not forced and seed % 3:
        for value, best_mixed in itertools.product(told, [mixed.design.objective]):
            assert value is not None
            assert best_mixed is not None
            assert sign * best_mixed <= sign * value + 1e-6 * max(1.0, abs(value))
