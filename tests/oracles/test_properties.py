"""What must hold of any solver of this model, whatever its answer is."""

from __future__ import annotations

import dataclasses

import pytest

from hubdesign.answer import Design, Status
from hubdesign.network import build_network
from hubdesign.problem import Demand, ListedLink, Problem, Station, Vehicle
from hubdesign.solve.control import Control
from hubdesign.solve.dispatch import solve
from tests.oracles.tiny import tiny_case

MONEY = {
    Station: ("hub_fixed_cost", "hub_setup_cost", "transfer_cost", "departure_fee", "volume_fee"),
    Demand: ("revenue", "unserved_cost"),
    Vehicle: ("cost_per_hour", "cost_per_departure", "cost_per_km", "cost_per_vehicle", "purchase_cost"),
    ListedLink: ("fixed_cost", "setup_cost", "unit_cost"),
}
MONEY_SETTINGS = (
    "unit_cost_per_km",
    "link_fixed_cost",
    "link_fixed_cost_per_km",
    "unserved_cost",
    "revenue_per_unit",
    "revenue_per_km",
    "co2_price_per_tonne",
    "cost_limit",
    "investment_limit",
)
VOLUME = {
    Station: ("hub_capacity", "collection_capacity"),
    Demand: ("volume",),
    Vehicle: ("capacity",),
    ListedLink: ("capacity",),
}
PER_VOLUME = {
    Station: ("transfer_cost", "volume_fee"),
    Demand: ("revenue", "unserved_cost"),
    Vehicle: (),
    ListedLink: ("unit_cost",),
}
PER_VOLUME_SETTINGS = ("unit_cost_per_km", "unserved_cost", "revenue_per_unit", "revenue_per_km")


def scaled(row: object, names: tuple[str, ...], factor: float) -> object:
    """Return `row` with the fields `names` multiplied; None stays None."""
    changes = {n: v * factor for n in names if (v := getattr(row, n)) is not None}
    return dataclasses.replace(row, **changes)  # type: ignore[type-var]


def with_scaled(problem: Problem, fields: dict[type, tuple[str, ...]], factor: float) -> Problem:
    """Return `problem` with the `fields` of its rows multiplied."""
    return problem.replace(
        **{
            table: tuple(scaled(row, fields[type(row)], factor) for row in getattr(problem, table))
            for table in ("stations", "demands", "vehicles", "links")
        }
    )


def answer_to(problem: Problem) -> Design:
    """Return the proven answer or proven infeasibility."""
    answer = solve(problem, Control(time_limit_s=30.0, gap=0.0), build_network(problem))
    assert answer.status in (Status.PROVEN, Status.INFEASIBLE)
    return answer


@pytest.mark.parametrize("factor", [1e-6, 1e-3, 1e6])
@pytest.mark.parametrize("seed", range(6100, 6112))
def test_the_unit_of_money_changes_neither_plan_nor_gap(seed: int, factor: float) -> None:
    problem = tiny_case(seed)
    money = {n: v * factor for n in MONEY_SETTINGS if (v := getattr(problem.settings, n)) is not None}
    other = with_scaled(problem, MONEY, factor).with_settings(**money)
    first, second = answer_to(problem), answer_to(other)
    assert first.status is second.status
    if first.objective is not None and second.objective is not None:
        by = 1.0 if problem.settings.goal == "most-volume" else factor
        size = max(abs(first.objective), 1.0)
        assert second.objective / by == pytest.approx(first.objective, rel=1e-6, abs=1e-6 * size)


@pytest.mark.parametrize("factor", [1e-6, 1e-3, 1e6])
@pytest.mark.parametrize("seed", range(6200, 6212))
def test_the_unit_of_volume_changes_neither_plan_nor_gap(seed: int, factor: float) -> None:
    problem = tiny_case(seed)
    each = {n: getattr(problem.settings, n) / factor for n in PER_VOLUME_SETTINGS}
    other = with_scaled(with_scaled(problem, VOLUME, factor), PER_VOLUME, 1.0 / factor).with_settings(**each)
    first, second = answer_to(problem), answer_to(other)
    assert first.status is second.status
    if first.objective is not None and second.objective is not None:
        by = factor if problem.settings.goal == "most-volume" else 1.0
        size = max(abs(first.objective), 1.0)
        assert second.objective / by == pytest.approx(first.objective, rel=1e-6, abs=1e-6 * size)


@pytest.mark.parametrize("seed", range(6300, 6320))
def test_renaming_and_reordering_change_nothing(seed: int) -> None:
    problem = tiny_case(seed)
    names = {row.station: f"Z{9 - place}" for place, row in enumerate(problem.stations)}
    other = problem.replace(
        stations=tuple(dataclasses.replace(r, station=names[r.station]) for r in reversed(problem.stations)),
        demands=tuple(
            dataclasses.replace(r, origin=names[r.origin], destination=names[r.destination])
            for r in reversed(problem.demands)
        ),
        links=tuple(
            dataclasses.replace(r, from_=names[r.from_], to=names[r.to]) for r in reversed(problem.links)
        ),
    )
    first, second = answer_to(problem), answer_to(other)
    assert first.status is second.status
    if first.objective is not None:
        assert second.objective == pytest.approx(first.objective, rel=1e-6, abs=1e-6)


@pytest.mark.parametrize("seed", range(6400, 6420))
def test_a_further_hub_candidate_never_makes_it_worse(seed: int) -> None:
    problem = tiny_case(seed)
    last = dataclasses.replace(problem.stations[-1], may_be_hub=True)
    first, second = answer_to(problem), answer_to(problem.replace(stations=(*problem.stations[:-1], last)))
    assert not (first.has_plan and second.status is Status.INFEASIBLE)
    if first.objective is not None and second.objective is not None:
        sign = 1.0 if problem.settings.goal == "least-cost" else -1.0
        slack = 1e-6 * max(1.0, abs(first.objective))
        assert sign * second.objective <= sign * first.objective + slack


@pytest.mark.parametrize("seed", range(6500, 6520))
def test_mixed_is_at_least_as_good_as_the_other_structures(seed: int) -> None:
    answers = {}
    for structure in ("mixed", "hub-and-spoke", "point-to-point"):
        problem = tiny_case(seed, structure="mixed", allocation="multiple", local_volume="refuse")
        demands = tuple(row for row in problem.demands if row.origin != row.destination)
        stations = tuple(dataclasses.replace(row, must_be_hub=False) for row in problem.stations)
        common = problem.replace(demands=demands, stations=stations)
        answers[structure] = answer_to(common.with_settings(structure=structure, max_transfers=2))
    sign = 1.0 if problem.settings.goal == "least-cost" else -1.0
    mixed = answers.pop("mixed")
    for other in answers.values():
        if other.objective is not None:
            assert mixed.objective is not None
            slack = 1e-6 * max(1.0, abs(other.objective))
            assert sign * mixed.objective <= sign * other.objective + slack
