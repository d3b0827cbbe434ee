"""Why nothing is feasible: each cheap proof, and a conflict, told in words with their numbers."""

from __future__ import annotations

import dataclasses

from hubdesign.diagnose import diagnose
from hubdesign.problem import Demand, ListedLink
from tests.test_rules import problem


def told(case: object) -> str:
    return "\n".join(diagnose(case, 10.0))  # type: ignore[arg-type]


def test_a_station_that_nothing_reaches() -> None:
    case = problem(unserved="forbidden")
    assert "no vehicle or link reaches C" in told(case.replace(links=case.links[:1]))


def test_a_demand_without_itinerary_is_named_with_the_rules() -> None:
    case = problem(unserved="forbidden", max_hours=2.0)
    slow = case.replace(links=(case.links[0], case.links[2]))
    assert "1 O-D demands have no itinerary under the rules" in told(slow)
    assert "A -> C" in told(slow)


def test_more_must_hubs_than_hubs() -> None:
    case = problem(hubs_max=1, stations={"A": {"must_be_hub": True}, "B": {"must_be_hub": True}})
    assert "2 stations must be hubs, at most 1 are allowed" in told(case)


def test_collection_capacity_below_the_volume() -> None:
    case = problem(
        structure="hub-and-spoke",
        allocation="single",
        max_transfers=2,
        unserved="forbidden",
        stations={"A": {"collection_capacity": 30.0}, "B": {"collection_capacity": 40.0}},
    )
    assert "80 of volume must be collected, all hub candidates may collect 70" in told(case)


def test_must_links_beyond_max_links_and_frequency() -> None:
    must = tuple(dataclasses.replace(link, decision="must") for link in problem().links)
    case = problem(stations={"A": {"max_links": 1}}).replace(links=must)
    assert "2 links at A must be operated, max_links is 1" in told(case)
    narrow = problem(max_frequency=2).replace(
        links=(dataclasses.replace(must[0], min_frequency=3.0), *must[1:])
    )
    assert "A - B by air must be operated at least 3 times but at most 2" in told(narrow)


def test_a_conflict_names_the_limit_that_would_have_to_give() -> None:
    case = problem(unserved="forbidden", cost_limit=30.0)
    answer = told(case)
    assert "together these cannot be kept" in answer
    assert "cost_limit" in answer


def test_capacity_below_the_demand_is_found() -> None:
    case = problem(unserved="forbidden").replace(
        vehicles=(),
        demands=(Demand("A", "B", 10.0),),
        links=(ListedLink("A", "B", distance_km=100.0, capacity=6.0),),
    )
    answer = told(case)
    assert "10 of volume must leave A, at most 6 can" in answer
    assert "10 of volume must reach B, at most 6 can" in answer


def test_departures_below_the_demand_are_found() -> None:
    case = problem(unserved="forbidden", stations={"A": {"max_departures": 1.0}})
    assert "60 of volume must leave A, at most 40 can" in told(case)
